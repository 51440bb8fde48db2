declare module 'siphash' {
  const siphash: {
    /** Key: four 32-bit words, little endian. */
    hash(key: readonly number[], message: string | Uint8Array): { readonly h: number; readonly l: number };
  };
  export default siphash;
}
