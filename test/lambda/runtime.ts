import { type ChildProcess, spawn } from 'node:child_process';
import { createServer, type ServerResponse } from 'node:http';
import type { AddressInfo } from 'node:net';
import { fileURLToPath } from 'node:url';

/** The Node that bundles are run on: that of the Lambda runtime when TALLYPOST_LAMBDA_NODE names one, else this one. */
export const lambdaNode = process.env.TALLYPOST_LAMBDA_NODE ?? process.execPath;

export interface Answer {
  readonly kind: 'response' | 'error';
  readonly value: unknown;
}

export interface StartedFunction {
  /** Of the initialisation, as the function's process measured it when it asked for its first event. */
  readonly init: { readonly wallMs: number; readonly cpuMs: number; readonly residentMb: number };
  invoke(event: unknown): Promise<Answer>;
  /** Largest resident size of the function's process until its last answer, in MB of 2^20 bytes. */
  readonly peakMb: () => number;
  /** Everything written to stdout and stderr so far. */
  readonly output: () => string;
  stop(): Promise<void>;
}

/** Starts a built bundle as Lambda would: in a process of its own, which asks for events and posts its answers by the
 *  published protocol. Source: AWS Lambda Developer Guide, "Using the Lambda runtime API for custom runtimes".
 *  Rejects with what the function reported when its initialisation failed. */
export async function startFunction(
  bundle: string,
  environment: Record<string, string>,
): Promise<StartedFunction> {
  const waitingEvents: { id: string; event: unknown }[] = [];
  const answers = new Map<string, (answer: Answer) => void>();
  let asking: ServerResponse | null = null;
  let settleInit: {
    resolve: (init: StartedFunction['init']) => void;
    reject: (error: Error) => void;
  } | null = null;
  const inited = new Promise<StartedFunction['init']>((resolve, reject) => {
    settleInit = { resolve, reject };
  });
  let count = 0;
  let peakMb = 0;

  function handOut(): void {
    if (asking === null) return;
    const next = waitingEvents.shift();
    if (next === undefined) return;
    asking.writeHead(200, {
      'content-type': 'application/json',
      'lambda-runtime-aws-request-id': next.id,
      'lambda-runtime-deadline-ms': String(Date.now() + 60_000),
      'lambda-runtime-invoked-function-arn': 'arn:aws:lambda:eu-west-2:000000000000:function:test',
    });
    asking.end(JSON.stringify(next.event));
    asking = null;
  }

  const server = createServer((request, response) => {
    let text = '';
    request.setEncoding('utf8');
    request.on('data', (chunk) => {
      text += chunk;
    });
    request.on('end', () => {
      const [, , , what, id, kind] = (request.url ?? '').split('/');
      if (what === 'invocation' && id === 'next') {
        settleInit?.resolve(JSON.parse(request.headers['x-init'] as string));
        asking = response;
        handOut();
        return;
      }
      response.writeHead(202).end();
      peakMb = Number(request.headers['x-peak-mb'] ?? 0);
      if (what === 'init') settleInit?.reject(new Error(text));
      else
        answers.get(id as string)?.({
          kind: kind as Answer['kind'],
          value: text === '' ? undefined : JSON.parse(text),
        });
    });
  });
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));

  const child: ChildProcess = spawn(
    lambdaNode,
    [fileURLToPath(new URL('./bootstrap.mjs', import.meta.url)), bundle],
    {
      env: {
        PATH: process.env.PATH ?? '',
        AWS_LAMBDA_RUNTIME_API: `127.0.0.1:${(server.address() as AddressInfo).port}`,
        AWS_REGION: 'eu-west-2',
        AWS_ACCESS_KEY_ID: 'testkey',
        AWS_SECRET_ACCESS_KEY: 'testsecret',
        NODE_NO_WARNINGS: '1',
        ...environment,
      },
      stdio: ['ignore', 'pipe', 'pipe'],
    },
  );
  let output = '';
  child.stdout?.setEncoding('utf8').on('data', (text) => {
    output += text;
  });
  child.stderr?.setEncoding('utf8').on('data', (text) => {
    output += text;
  });
  const exited = new Promise<void>((resolve) => child.once('exit', () => resolve()));
  child.once('exit', (code) => {
    settleInit?.reject(new Error(`the function ended with ${code}: ${output}`));
    for (const settle of answers.values())
      settle({ kind: 'error', value: `the function ended with ${code}: ${output}` });
  });

  const stop = async (): Promise<void> => {
    child.kill('SIGKILL');
    await exited;
    server.closeAllConnections();
    await new Promise((resolve) => server.close(resolve));
  };
  let init: StartedFunction['init'];
  try {
    init = await inited;
  } catch (error) {
    await stop();
    throw error;
  }
  return {
    init,
    output: () => output,
    peakMb: () => peakMb,
    stop,
    invoke(event) {
      count += 1;
      const id = `00000000-0000-4000-8000-${String(count).padStart(12, '0')}`;
      return new Promise((resolve) => {
        answers.set(id, resolve);
        waitingEvents.push({ id, event });
        handOut();
      });
    },
  };
}
