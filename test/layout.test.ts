import { readdirSync, readFileSync } from 'node:fs';
import { dirname, join, normalize } from 'node:path';
import { describe, expect, it } from 'vitest';

const root = new URL('..', import.meta.url).pathname;

interface Source {
  /** From the project's root, e.g. `src/desk/desk.ts`. */
  readonly path: string;
  readonly text: string;
  /** Without comments and the insides of strings and templates. */
  readonly code: string;
  readonly imports: readonly { readonly from: string; readonly isTypeOnly: boolean }[];
}

const sources: readonly Source[] = readdirSync(join(root, 'src'), { recursive: true, encoding: 'utf8' })
  .filter((name) => name.endsWith('.ts') && !name.endsWith('.d.ts'))
  .map((name) => readSource(`src/${name}`));

function readSource(path: string): Source {
  const text = readFileSync(join(root, path), 'utf8');
  const uncommented = text.replace(/\/\*[\s\S]*?\*\//g, '').replace(/^\s*\/\/.*$/gm, '');
  const statements = uncommented.matchAll(/^(import|export)\s+(type\s+)?[^'";]*?from\s*'([^']+)'/gm);
  const bare = uncommented.matchAll(/\bimport\s*\(?\s*'([^']+)'/g);
  return {
    path,
    text,
    code: uncommented.replace(/'(?:\\.|[^'\\\n])*'|"(?:\\.|[^"\\\n])*"/g, "''"),
    imports: [
      ...[...statements].map(([, , type, from]) => ({ from: from!, isTypeOnly: type !== undefined })),
      ...[...bare].map(([, from]) => ({ from: from!, isTypeOnly: false })),
    ],
  };
}

/** `src/desk/desk.ts` belongs to `desk`, `src/bounds.ts` to `bounds`. */
const partOf = (path: string) => path.split('/')[1]!.replace(/\.ts$/, '');

/** What each part may import of the others; the errors, the bounds and itself always. */
const allowed: Record<string, readonly string[]> = {
  errors: [],
  bounds: [],
  text: [],
  message: ['text'],
  desk: ['text'],
  features: ['message', 'desk', 'text'],
  model: ['features'],
  decision: ['model', 'desk', 'message', 'text'],
  store: [],
  ledger: ['store', 'model', 'features', 'desk'],
  explain: ['text', 'message', 'desk', 'features', 'model', 'decision'],
  html: ['text'],
  cost: [],
  metrics: [],
  intake: ['store', 'desk', 'message', 'text'],
  report: [...core(), 'explain', 'html', 'store', 'ledger'],
  settle: [...core(), 'explain', 'html', 'store', 'ledger'],
  handlers: [...core(), 'explain', 'html', 'metrics', 'store', 'ledger', 'intake', 'report', 'settle'],
  cli: [...core(), 'explain', 'html', 'cost', 'store', 'ledger', 'intake', 'report', 'settle', 'handlers'],
};

/** Values in, values out. */
function core(): string[] {
  return ['text', 'message', 'desk', 'features', 'model', 'decision'];
}

/** Every relative import of the sources, resolved. */
const links = sources.flatMap(({ path, imports }) =>
  imports
    .filter(({ from }) => from.startsWith('.'))
    .map(({ from, isTypeOnly }) => ({ path, to: normalize(join(dirname(path), from)), isTypeOnly })),
);

describe('the layout', () => {
  it('is seen whole by this test', () => {
    expect(sources.length).toBeGreaterThan(80);
    expect(links.length).toBeGreaterThan(300);
    expect(
      [...new Set(sources.map(({ path }) => partOf(path)))].filter((part) => !(part in allowed)),
    ).toEqual([]);
  });

  it('has imports that point one way', () => {
    const wrong = links.filter(({ path, to }) => {
      const [from, into] = [partOf(path), partOf(to)];
      return from !== into && into !== 'errors' && into !== 'bounds' && !allowed[from]?.includes(into);
    });
    expect(wrong).toEqual([]);
  });

  it('lets the model know of features no more than their schema', () => {
    const wrong = links.filter(({ path, to }) => partOf(path) === 'model' && partOf(to) === 'features');
    expect(wrong.filter(({ to }) => to !== 'src/features/schema.ts')).toEqual([]);
  });

  it('writes relative imports with their ending', () => {
    expect(links.filter(({ to }) => !to.endsWith('.ts') && !to.endsWith('.json'))).toEqual([]);
  });

  it('keeps the core free of files, network, clocks, chance and settings', () => {
    const outside = /^(node:(fs|http|https|net|child_process|os|process|timers|worker_threads)|@aws-sdk)/;
    const wrong = sources
      .filter(({ path }) => [...core(), 'explain', 'html', 'cost', 'metrics'].includes(partOf(path)))
      .flatMap(({ path, code, imports }) => [
        ...imports.filter(({ from }) => outside.test(from)).map(({ from }) => `${path}: ${from}`),
        ...[
          ...code.matchAll(
            /\bDate\.now\b|\bnew Date\(\)|\bMath\.random\b|\bprocess\.|\bsetTimeout\b|\bfetch\(|\bconsole\./g,
          ),
        ].map(([found]) => `${path}: ${found}`),
      ]);
    expect(wrong).toEqual([]);
  });

  it('has no default export and passes nothing on from other files', () => {
    const wrong = sources.filter(({ code }) => /^export (default|\*|\{[^}]*\} from)/m.test(code));
    expect(wrong.map(({ path }) => path)).toEqual([]);
  });

  it('names files in kebab-case and keeps them under 400 lines', () => {
    expect(
      sources.map(({ path }) => path).filter((path) => !/^src(\/[a-z0-9]+(-[a-z0-9]+)*)+\.ts$/.test(path)),
    ).toEqual([]);
    expect(sources.filter(({ text }) => text.split('\n').length > 400).map(({ path }) => path)).toEqual([]);
  });

  it('keeps every handler to a screen', () => {
    const long: string[] = [];
    let seen = 0;
    for (const { path, text } of sources.filter(({ path }) => partOf(path) === 'handlers')) {
      for (const [body, name] of text.matchAll(/^export function (create\w*Handler)\b[\s\S]*?^}$/gm)) {
        seen += 1;
        if (body.split('\n').length > 50) long.push(`${path}: ${name}`);
      }
    }
    expect(seen).toBeGreaterThanOrEqual(4);
    expect(long).toEqual([]);
  });
});
