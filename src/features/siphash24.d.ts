/** What is used of the package: SipHash-2-4 in WebAssembly. */
declare module 'siphash24' {
  /** Writes the hash into `out`, low byte first. Throws on short keys and outputs unless told not to look. */
  function siphash24(data: Uint8Array, key: Uint8Array, out: Uint8Array, isTrusted?: boolean): Uint8Array;
  namespace siphash24 {
    const BYTES: 8;
  }
  export default siphash24;
}
