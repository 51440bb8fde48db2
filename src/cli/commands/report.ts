import { join, resolve } from 'node:path';
import { pathToFileURL } from 'node:url';
import type { Command } from 'commander';
import { readMessage } from '../../handlers/read-message.ts';
import { isOpened } from '../../handlers/report.ts';
import { writeReport } from '../../report/write-report.ts';
import { size } from '../layout.ts';
import { openSession, type StoreFlags, withStore } from '../store-session.ts';
import { type Answer, answer, type Terminal } from '../terminal.ts';

export function addReport(program: Command, terminal: Terminal, end: (code: number) => void): void {
  withStore(program.command('report'))
    .description('write the page that says how far routing can be trusted, as of now')
    .action(async (flags: StoreFlags) =>
      end(await answer(terminal, flags.json === true, () => report(flags))),
    );
}

async function report(flags: StoreFlags): Promise<Answer> {
  const { world, desk, extractor } = await openSession(flags.store);
  const { data, page, numbers, pageBytes } = await writeReport(world, desk, extractor, {
    readMessage: async (key) => (await readMessage(world, key, isOpened))?.message ?? null,
  });
  const isDirectory = !/^[a-z0-9]+:\/\//i.test(flags.store);
  const place = isDirectory ? pathToFileURL(resolve(join(flags.store, page))).href : `${flags.store}/${page}`;
  return {
    json: { page, numbers, pageBytes, data },
    text: `report of ${data.madeAt.slice(0, 16).replace('T', ' ')} UTC, ${size(pageBytes)}: ${place}`,
  };
}
