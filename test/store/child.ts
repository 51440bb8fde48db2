import { type ChildProcess, fork } from 'node:child_process';
import { fileURLToPath } from 'node:url';
import { build } from 'esbuild';

/** Bundles a TypeScript module into one file that plain Node runs; gives its path. */
export async function bundleChild(source: string, outfile: string): Promise<string> {
  await build({
    entryPoints: [fileURLToPath(new URL(source, import.meta.url))],
    outfile,
    bundle: true,
    platform: 'node',
    format: 'esm',
    target: 'node20',
    mainFields: ['module', 'main'],
    banner: {
      js: "import { createRequire as __createRequire } from 'node:module'; const require = __createRequire(import.meta.url);",
    },
    logLevel: 'error',
  });
  return outfile;
}

/** Starts a bundled child that takes orders and answers by messages. */
export function startChild(
  path: string,
  args: readonly string[],
  options: { uid?: number } = {},
): ChildProcess {
  return fork(path, args, { ...options, execArgv: [], stdio: ['ignore', 'inherit', 'inherit', 'ipc'] });
}

/** Gives a child one order and waits for its answer; fails when it dies first. */
export function ask(child: ChildProcess, order: unknown): Promise<unknown> {
  return new Promise((resolve, reject) => {
    const settle = (act: () => void): void => {
      child.off('message', onMessage);
      child.off('exit', onExit);
      act();
    };
    const onMessage = (answer: unknown): void => settle(() => resolve(answer));
    const onExit = (code: number | null, signal: string | null): void =>
      settle(() => reject(new Error(`the child ended with ${code ?? signal}`)));
    child.on('message', onMessage);
    child.on('exit', onExit);
    child.send(order as object);
  });
}
