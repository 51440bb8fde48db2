/** Plain text for people: aligned columns, numbers at a readable precision. */

/** Columns two spaces apart; numbers (cells that start with a digit, or are marked by `align`) to the right. */
export function columns(
  rows: readonly (readonly string[])[],
  align: readonly ('left' | 'right')[] = [],
): string {
  const widths: number[] = [];
  for (const row of rows)
    row.forEach((cell, index) => {
      widths[index] = Math.max(widths[index] ?? 0, width(cell));
    });
  return rows
    .map((row) =>
      row
        .map((cell, index) => {
          const gap = ' '.repeat(widths[index] - width(cell));
          return align[index] === 'right' ? gap + cell : cell + gap;
        })
        .join('  ')
        .trimEnd(),
    )
    .join('\n');
}

// biome-ignore lint/suspicious/noControlCharactersInRegex: colour codes take no room.
const colourCodes = /\u001b\[\d+m/g;

function width(cell: string): number {
  return [...cell.replace(colourCodes, '')].length;
}

/** 0.9312 as `93.1 %`. */
export function percent(share: number, digits = 1): string {
  return `${(share * 100).toFixed(digits)} %`;
}

/** 1234567 as `1,234,567`. */
export function count(value: number): string {
  return Math.round(value).toLocaleString('en-GB');
}

/** Bytes with a unit of 1,024. */
export function size(bytes: number): string {
  if (bytes < 1024) return `${bytes} B`;
  const units = ['KiB', 'MiB', 'GiB'];
  let value = bytes / 1024;
  let unit = 0;
  for (; value >= 1024 && unit < units.length - 1; unit += 1) value /= 1024;
  return `${value.toFixed(1)} ${units[unit]}`;
}

/** Staff minutes as hours where that reads better. */
export function minutes(value: number): string {
  return Math.abs(value) < 120 ? `${value.toFixed(0)} min` : `${count(value / 60)} h`;
}

/** `1 message`, `2 messages`. */
export function plural(value: number, one: string, many = `${one}s`): string {
  return `${count(value)} ${value === 1 ? one : many}`;
}
