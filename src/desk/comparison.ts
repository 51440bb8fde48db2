import { foldText } from '../text/words.ts';
import type { ClosedField } from './desk.ts';

/** The declared choice that a submitted value stands for, compared NFKC and case folded; `missing` when it is blank or
 *  not there, `other` when it is none of the declared ones. */
export function choiceOf(field: ClosedField, given: string | undefined): string {
  const folded = foldText(given ?? '').trim();
  if (folded === '') return 'missing';
  return field.values.find((value) => foldText(value).trim() === folded) ?? 'other';
}

/** Whether a domain is this one or below it. Both in lower case and ASCII form. */
export function isUnder(domain: string, suffix: string): boolean {
  return domain === suffix || domain.endsWith(`.${suffix}`);
}
