/** The package ships no types. */
declare module 'siphash' {
  namespace siphash {
    interface Halves {
      readonly h: number;
      readonly l: number;
    }
    /** `key`: four 32-bit words, little endian. */
    function hash(key: readonly number[], message: Uint8Array): Halves;
  }
  export default siphash;
}
