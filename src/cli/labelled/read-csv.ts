import { Readable } from 'node:stream';
import { type CsvError, type Info, parse } from 'csv-parse';
import { bounds } from '../../bounds.ts';
import { TallypostError } from '../../errors.ts';
import { bad, formJson, type LabelledStream, readTime, type Unusable } from './labelled.ts';

interface Row {
  readonly record: Record<string, string | undefined>;
  readonly info: Info;
}

/** RFC 4180 with a header line that names at least `text` and `queue`, optionally `at`; a row becomes a form of one field.
 *  @throws TallypostError csv-columns when the header lacks one of them: then no row can be read. */
export async function* readCsv(chunks: AsyncIterable<Uint8Array>, file: string): LabelledStream {
  const skipped: Unusable[] = [];
  let columns: string[] = [];
  const parser = parse({
    bom: true,
    columns: (header: string[]) => {
      columns = header.map((name) => name.trim().toLowerCase());
      return columns;
    },
    info: true,
    relax_column_count: false,
    skip_empty_lines: true,
    skip_records_with_error: true,
    max_record_size: bounds.csvRecordCharsMax,
    on_skip: (error?: CsvError) => {
      skipped.push(
        bad('row-unreadable', `${file}:${error?.lines ?? '?'}`, 'a row of RFC 4180', reasonOf(error)),
      );
      return undefined;
    },
  });
  const source = Readable.from(chunks, { objectMode: false });
  source.on('error', (error) => parser.destroy(error));
  source.pipe(parser);
  let areColumnsChecked = false;
  try {
    for await (const row of parser as AsyncIterable<Row>) {
      if (!areColumnsChecked) checkColumns(columns, file);
      areColumnsChecked = true;
      yield* skipped.splice(0);
      const place = `${file}:${row.info.lines}`;
      const { text = '', queue = '', at = '' } = row.record;
      const label = queue.trim();
      if (label === '') yield bad('queue-missing', place, 'a queue', 'an empty column');
      else if (at !== '' && readTime(at) === null)
        yield bad('time-unreadable', place, 'a time as 2026-03-01T10:00:00Z', 'another text');
      else {
        const json = formJson('csv', { text }, at === '' ? null : new Date(readTime(at)!).toISOString());
        const atMs = at === '' ? null : readTime(at);
        yield { kind: 'item', label, atMs, place, content: { kind: 'form', json } };
      }
    }
    if (!areColumnsChecked) checkColumns(columns, file);
  } catch (error) {
    if (error instanceof TallypostError) throw error;
    // What csv-parse does not skip: a record without an end, or one beyond the bound. The rest of the file is unreadable.
    yield* skipped.splice(0);
    const lines = (error as { lines?: number }).lines;
    yield bad('csv-unreadable', `${file}:${lines ?? '?'}`, 'rows of RFC 4180', reasonOf(error));
    return;
  } finally {
    source.destroy();
    parser.destroy();
  }
  yield* skipped.splice(0);
}

function checkColumns(columns: readonly string[], file: string): void {
  if (columns.includes('text') && columns.includes('queue')) return;
  throw new TallypostError({
    code: 'csv-columns',
    place: `${file}:1`,
    expected: 'a header line with the columns text and queue',
    got: `${columns.length} other columns`,
  });
}

/** The parser's messages quote the row; its codes do not. */
function reasonOf(error: unknown): string {
  const code = (error as { code?: string } | undefined)?.code;
  return typeof code === 'string' ? code.toLowerCase().replaceAll('_', ' ') : 'an unreadable row';
}
