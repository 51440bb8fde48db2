/** Decibans in words, for readers who never heard of them. */
export function oddsInWords(decibans: number): string {
  const odds = 10 ** (Math.abs(decibans) / 10);
  if (odds < 1.15) return 'as likely as not';
  if (odds < 10) return `${odds.toFixed(1).replace(/\.0$/, '')} to 1`;
  if (odds >= 1_000_000) return 'over a million to 1';
  const magnitude = 10 ** Math.max(0, Math.floor(Math.log10(odds)) - 1);
  return `${(Math.round(odds / magnitude) * magnitude).toLocaleString('en-GB')} to 1`;
}

/** `+3.2`, `−0.5`, with a true minus sign. */
export function signedDecibans(decibans: number): string {
  const text = Math.abs(decibans).toFixed(1);
  if (text === '0.0') return '0.0';
  return decibans < 0 ? `−${text}` : `+${text}`;
}
