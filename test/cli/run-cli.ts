import { mkdir, writeFile } from 'node:fs/promises';
import { dirname, join } from 'node:path';
import picocolors from 'picocolors';
import { runProgram } from '../../src/cli/program.ts';

export interface Ran {
  readonly code: number;
  readonly out: string;
  readonly err: string;
  /** stdout as JSON. */
  // biome-ignore lint/suspicious/noExplicitAny: answers of many shapes, each test names the members that it expects.
  json(): any;
}

/** Runs a command line in this process and catches what it writes. */
export async function runCli(...args: string[]): Promise<Ran> {
  let [out, err] = ['', ''];
  const code = await runProgram(args, {
    out: (text) => {
      out += text;
    },
    err: (text) => {
      err += text;
    },
    isWatched: false,
    colours: picocolors.createColors(false),
  });
  return { code, out, err, json: () => JSON.parse(out) };
}

/** Files below a folder, by their names. */
export async function lay(root: string, files: Record<string, string | Uint8Array>): Promise<void> {
  for (const [name, content] of Object.entries(files)) {
    await mkdir(dirname(join(root, name)), { recursive: true });
    await writeFile(join(root, name), content);
  }
}

/** A mail of one line of text. */
export function mail(subject: string, text: string): string {
  return `From: Pat Doe <pat@customer.example>\r\nTo: desk@desk.example\r\nSubject: ${subject}\r\nDate: Mon, 2 Mar 2026 10:00:00 +0000\r\n\r\n${text}\r\n`;
}

export const deskFile = JSON.stringify({
  version: 1,
  name: 'Test desk',
  queues: [
    { id: 'billing', title: 'Bills' },
    { id: 'leaks', title: 'Leaks' },
    { id: 'moves', title: 'Moving home' },
  ],
  costs: { lookMinutes: 2, wrongRouteMinutes: 15 },
  guards: [{ id: 'danger', queue: 'leaks', phrases: ['danger to life'] }],
});

/** Sentences that tell three queues apart, with words in common. */
const sentences: Record<string, readonly string[]> = {
  billing: [
    'my bill is wrong and I paid it',
    'please send the invoice for my account',
    'the direct debit was taken twice from my account',
    'I want a refund of the bill that I paid',
    'the amount on the invoice is too high',
  ],
  leaks: [
    'water is running down the road from a burst pipe',
    'there is a leak under the pavement by my house',
    'a pipe burst and water comes through the wall',
    'the stop tap is leaking and water runs into the road',
    'please repair the leak in front of my house',
  ],
  moves: [
    'I am moving to a new address next week',
    'we are leaving this house and need a final account',
    'please close the account, I move out on Friday',
    'my tenant moved in and I moved out',
    'we bought a house and move in next month',
  ],
};

/** `count` labelled sentences, queues in turn. */
export function labelled(count: number): { queue: string; text: string }[] {
  const queues = Object.keys(sentences);
  return Array.from({ length: count }, (_, i) => {
    const queue = queues[i % queues.length];
    const lines = sentences[queue];
    return { queue, text: `${lines[Math.floor(i / queues.length) % lines.length]}, thank you ${i}` };
  });
}
