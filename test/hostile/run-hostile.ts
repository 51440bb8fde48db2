import { Buffer } from 'node:buffer';
import { performance } from 'node:perf_hooks';
import { parseForm } from '../../src/message/form.ts';
import { parseMail } from '../../src/message/mail.ts';
import type { Message } from '../../src/message/message.ts';
import type { HostileInput } from './hostile-input.ts';
import { hostileInputs } from './hostile-inputs.ts';

/** One line of the report, written as JSON. */
export interface HostileResult {
  readonly name: string;
  readonly cpuMs: number;
  /** Largest resident size of the process so far, in MB of 2^20 bytes. */
  readonly peakMb: number;
  readonly defects: readonly string[];
  /** What is not as the table says; empty when all is. */
  readonly faults: readonly string[];
}

/** Runs in a process of its own: parses every input, one after the other, and writes a line for each. */
for (const input of hostileInputs) {
  process.stdout.write(`${JSON.stringify({ starting: input.name })}\n`);
  const built = input.build();
  const started = process.cpuUsage();
  let message: Message | null = null;
  let thrown: unknown = null;
  try {
    message =
      input.channel === 'form'
        ? parseForm(built as Uint8Array)
        : await parseMail(built, { nowMs: () => performance.now() });
  } catch (error) {
    thrown = error;
  }
  const used = process.cpuUsage(started);
  const result: HostileResult = {
    name: input.name,
    cpuMs: (used.user + used.system) / 1000,
    peakMb: process.resourceUsage().maxRSS / 1024,
    defects: message === null ? [] : message.defects.map(({ code }) => code),
    faults: message === null ? [`threw ${thrown}`] : faultsOf(input, message),
  };
  process.stdout.write(`${JSON.stringify(result)}\n`);
}

function faultsOf(input: HostileInput, message: Message): string[] {
  const faults: string[] = [];
  const codes = new Set<string>(message.defects.map(({ code }) => code));
  for (const code of input.defects) if (!codes.has(code)) faults.push(`defect ${code} missing`);
  if (input.isExact) {
    for (const code of codes)
      if (!input.defects.includes(code as never)) faults.push(`defect ${code} not expected`);
  }
  if (input.keeps !== undefined && !message.text.includes(input.keeps)) {
    faults.push(`text lost: ${JSON.stringify(message.text.slice(0, 200))}`);
  }
  if (input.drops !== undefined && message.ownText.includes(input.drops))
    faults.push(`${input.drops} counted`);
  if (message.text !== '' && message.ownText === '') faults.push('no own text');
  if (message.text.length > 65_536 + 200) faults.push('text too long');
  if (Buffer.byteLength(JSON.stringify(message)) > 2 * 1024 * 1024) faults.push('message too large');
  for (const text of [message.text, message.subject, message.messageId]) {
    if (/[^\P{Cc}\t\n]/u.test(text)) faults.push('control character kept');
  }
  const fault = input.check?.(message) ?? null;
  if (fault !== null) faults.push(fault);
  return faults;
}
