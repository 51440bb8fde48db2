import { expect, it } from 'vitest';
import { createReportHandler } from '../../src/handlers/report.ts';
import type { Measurement } from '../../src/metrics/measurement.ts';
import type { Store } from '../../src/store/store.ts';
import { openStation, teach } from '../handlers/station.ts';

it('the report’s function writes page and numbers, counts itself, and opens no message that is large', async () => {
  const station = await openStation();
  await teach(station);
  await station.compact({});
  const opened: string[] = [];
  const sizes = { 'mail/small': 100, 'mail/large': 4_200_000 };
  for (const [name, bytes] of Object.entries(sizes))
    await station.feed(station.route, await station.putMail(name, 'Hello', `zebra ${'x'.repeat(bytes)}`));
  const store: Store = {
    ...station.store,
    async stream(key) {
      const found = await station.store.stream(key);
      return (
        found && {
          head: found.head,
          chunks: (async function* () {
            for await (const chunk of found.chunks) {
              opened.push(key);
              yield chunk;
            }
          })(),
        }
      );
    },
  };
  const measured: Measurement[] = [];
  const report = createReportHandler({
    ...station.deps,
    world: { ...station.world, store },
    measure: (more) => void measured.push(...more),
  });
  const { page, numbers, pageBytes } = await report({});
  expect([page, numbers]).toEqual(['reports/2026-03-02.html', 'reports/2026-03-02.json']);
  expect((await station.store.head('reports/latest.html'))?.bytes).toBe(pageBytes);
  expect(await station.json('reports/latest.json')).toMatchObject({ waiting: { messages: 2 } });
  expect(measured).toEqual([{ queue: null, values: { Reports: [1] } }]);
  expect(opened.filter((key) => key === 'inbound/mail/small').length).toBeGreaterThan(0);
  // Opened as far as its first piece, to give the connection back.
  expect(opened.filter((key) => key === 'inbound/mail/large').length).toBeLessThanOrEqual(1);
  await station.putDesk('{');
  station.pass(120_000);
  await expect(report({})).rejects.toThrow('desk-not-json');
  expect(measured).toHaveLength(1);
  expect(station.log.at(-1)).toMatchObject({ level: 'error', event: 'report-failed' });
});
