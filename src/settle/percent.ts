/** A probability as people read it: never rounded to certainty. */
export function percent(probability: number): string {
  const hundred = probability * 100;
  if (hundred > 99 && hundred < 100) return 'over 99\u00a0%';
  return hundred > 0 && hundred < 1 ? 'under 1\u00a0%' : `${Math.round(hundred)}\u00a0%`;
}
