import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { version } from '../../src/cli/version.ts';
import { readDesk } from '../../src/desk/read-desk.ts';
import { readDrop } from '../../src/handlers/read-drop.ts';
import { parseForm } from '../../src/message/form.ts';
import { runCli } from './run-cli.ts';

const root = new URL('../..', import.meta.url);
const read = (name: string) => readFileSync(new URL(name, root), 'utf8');
const readme = read('README.md');
const scripts = JSON.parse(read('package.json')).scripts;

/** Indented blocks of the README, without their indent. */
const blocks = [...readme.matchAll(/(?:^ {4}.*\n)+/gm)].map(([block]) => block.replace(/^ {4}/gm, ''));
const lines = blocks.flatMap((block) => block.trimEnd().split('\n'));

describe('what the README promises', () => {
  const commands = lines.filter((line) => line.startsWith('node dist/cli/tallypost.js '));
  it('are commands', () => {
    expect(commands.length).toBeGreaterThan(5);
  });
  it.each(commands)('%s is a command with those options', async (line) => {
    const [name, ...rest] = line.split(' ').slice(2);
    const { code, out } = await runCli(name, '--help');
    expect(code).toBe(0);
    for (const option of rest.filter((part) => part.startsWith('--'))) expect(out).toContain(option);
  });
  it.each([...readme.matchAll(/^\| `([a-z]+)([^`]*)`.*\|$/gm)].map(([, name, rest]) => [name, rest]))(
    'the table has %s%s',
    async (name, rest) => {
      const { code, out } = await runCli(name, '--help');
      expect(code).toBe(0);
      for (const [option] of rest.matchAll(/--[a-z-]+/g)) expect(out).toContain(option);
    },
  );
  it.each(lines.filter((line) => line.startsWith('npm ')))('%s is a script', (line) => {
    const name = line.split(' ').at(-1)!;
    expect(Object.keys(scripts)).toContain(name);
  });
  it('the form and the confirmation are read', () => {
    const form = lines.find((line) => line.startsWith('{"form"'))!;
    expect(parseForm(Buffer.from(form))).toMatchObject({ channel: 'form', defects: [] });
    const drop = lines.find((line) => line.startsWith('{"message"'))!;
    expect(readDrop(Buffer.from(drop), 'README').queue).toBe('leaks');
  });
  it('the desk is valid', () => {
    const desk = blocks.find((block) => block.startsWith('{\n'))!;
    expect(readDesk(Buffer.from(desk), 'README').guards).toHaveLength(1);
  });
});

it('the version is one', () => {
  expect(JSON.parse(read('package.json')).version).toBe(version);
  expect(read('DEVELOPERS.md')).toContain(`### ${version}\n`);
});
