/** What is used of the package: quadratic programs by Goldfarb and Idnani's dual method. */
declare module 'quadprog' {
  /** Least ½ x'Dx - d'x over A'x ≥ b. All arrays count from 1; what stands at 0 is not read. D is overwritten. */
  export function solveQP(
    D: number[][],
    d: number[],
    A: number[][],
    b: number[],
  ): { readonly solution: number[]; readonly message: string };
}
