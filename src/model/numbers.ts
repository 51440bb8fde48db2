/** A typed array that grows. */
export class Numbers<A extends Float64Array | Uint32Array> {
  length = 0;
  readonly #of: new (
    length: number,
  ) => A;
  #values: A;

  constructor(of: new (length: number) => A) {
    this.#of = of;
    this.#values = new of(256);
  }

  push(value: number): void {
    if (this.length === this.#values.length) {
      const grown = new this.#of(this.#values.length * 2);
      grown.set(this.#values);
      this.#values = grown;
    }
    this.#values[this.length++] = value;
  }

  /** What was pushed, in room of its own length. */
  taken(): A {
    return this.#values.slice(0, this.length) as A;
  }
}
