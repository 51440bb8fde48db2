import { describe, expect, it } from 'vitest';
import { runCli } from '../cli/run-cli.ts';

describe('tallypost cost', () => {
  it('shows three scales beside each other, with the sum and the price of a thousand messages', async () => {
    const { code, out } = await runCli('cost');
    expect(code).toBe(0);
    expect(out).toMatch(/messages a month +1,000 +100,000 +10,000,000/);
    const [sums, each] = ['a month', 'for 1,000 messages'].map((name) =>
      out
        .split('\n')
        .find((line) => line.trim().startsWith(name))!
        .match(/[\d,]+\.\d\d/g)!
        .map((text) => Number(text.replaceAll(',', ''))),
    );
    expect(sums).toHaveLength(3);
    expect(sums![0]).toBeLessThan(sums![1]!);
    expect(sums![1]).toBeLessThan(sums![2]!);
    expect(each![0]).toBeGreaterThan(each![2]!);
    expect(each![1]).toBeCloseTo(sums![1]! / 100, 1);
  });

  it('shows one scale line by line, and as JSON with all that it assumed', async () => {
    const { out } = await runCli('cost', '--messages', '100000');
    // 80,000 mails · $100 a million.
    expect(out).toMatch(/\$8\.00 +SES +mail received +80,000 messages/);
    const { code, json } = await runCli('cost', '--messages', '100000', '--mail-share', '0', '--json');
    expect(code).toBe(0);
    const answer = json();
    expect(answer.load).toMatchObject({ messages: 100_000, mailShare: 0 });
    expect(answer.lines.find((line: { what: string }) => line.what === 'mail received').dollars).toBe(0);
    expect(answer.prices.lambdaGbSecond).toBe(0.0000133334);
    const sum = answer.lines.reduce((total: number, line: { dollars: number }) => total + line.dollars, 0);
    expect(answer.totalDollars).toBeCloseTo(sum, 9);
  });

  it.each([
    ['--messages', '0'],
    ['--messages', 'many'],
    ['--mail-share', '1.5'],
    ['--confirmed-share', ''],
    ['--queues', '-1'],
  ])('refuses %s %s', async (option, value) => {
    const { code, err } = await runCli('cost', option, value);
    expect(code).toBe(2);
    expect(err).toContain('Expected');
  });
});
