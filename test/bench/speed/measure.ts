/** One line of the table. */
export interface Row {
  readonly what: string;
  /** Processor time of one piece of work, median over the rounds: other processes of the machine are not in it. */
  readonly ms: number;
  /** Against the case named `against`, of the same rounds; null: there is none. */
  readonly ratio: number | null;
  readonly note: string;
}

export interface Case {
  readonly what: string;
  /** Pieces of work that one call does. */
  readonly pieces: number;
  readonly run: () => unknown;
  readonly note?: string;
}

const warmUpRounds = 3;

/** Runs all cases in turn, round after round, so that whatever else the machine does meets them alike; each round begins with
 *  another case, so that what comes at regular distances, as the collection of garbage, does not always meet the same one.
 *  The first rounds only warm up. */
export async function sideBySide(cases: readonly Case[], rounds: number, against?: string): Promise<Row[]> {
  const taken = cases.map((): number[] => []);
  for (let round = -warmUpRounds; round < rounds; round++) {
    for (let turn = 0; turn < cases.length; turn++) {
      const i = (turn + round + warmUpRounds) % cases.length;
      const each = cases[i];
      const before = process.cpuUsage();
      await each.run();
      const { user, system } = process.cpuUsage(before);
      if (round >= 0) taken[i].push((user + system) / 1000 / each.pieces);
    }
  }
  const medians = taken.map(median);
  const base = cases.findIndex((each) => each.what === against);
  return cases.map((each, i) => ({
    what: each.what,
    ms: medians[i],
    ratio: base < 0 ? null : medians[i] / medians[base],
    note: each.note ?? '',
  }));
}

export function median(values: readonly number[]): number {
  const sorted = [...values].sort((a, b) => a - b);
  const middle = sorted.length >> 1;
  return sorted.length % 2 === 1 ? sorted[middle] : (sorted[middle - 1] + sorted[middle]) / 2;
}

/** Slope of log y over log x by least squares: 1 is linear growth. */
export function growthExponent(x: readonly number[], y: readonly number[]): number {
  const [u, v] = [x.map(Math.log), y.map(Math.log)];
  const mean = (values: readonly number[]) => values.reduce((a, b) => a + b, 0) / values.length;
  const [mu, mv] = [mean(u), mean(v)];
  return (
    u.reduce((sum, each, i) => sum + (each - mu) * (v[i] - mv), 0) /
    u.reduce((sum, each) => sum + (each - mu) ** 2, 0)
  );
}
