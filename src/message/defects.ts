import { bounds } from '../bounds.ts';
import type { Defect } from './message.ts';

/** What a defect says about a message: a bound was reached, something was damaged, or something was made to mislead. */
export type DefectKind = 'bound' | 'damage' | 'deceit' | 'note';

/** Every defect that parsing can record. */
export const defectKinds = {
  // A bound was reached; what was read so far counts.
  'raw-cut': 'bound',
  'time-cut': 'bound',
  'header-cut': 'bound',
  'parts-cut': 'bound',
  'depth-cut': 'bound',
  'text-cut': 'bound',
  'html-cut': 'bound',
  'html-depth-cut': 'bound',
  'style-cut': 'bound',
  'subject-cut': 'bound',
  'recipients-cut': 'bound',
  'form-cut': 'bound',
  'field-cut': 'bound',
  'fields-cut': 'bound',
  'defects-cut': 'bound',
  // Something could not be read as it was written.
  'message-empty': 'damage',
  'source-failed': 'damage',
  'header-missing': 'damage',
  'header-line-unreadable': 'damage',
  'blank-lines-first': 'damage',
  'line-ends-bare-cr': 'damage',
  'boundary-missing': 'damage',
  'boundary-guessed': 'damage',
  'encoding-unknown': 'damage',
  'encoding-damaged': 'damage',
  'charset-undeclared': 'damage',
  'charset-unknown': 'damage',
  'charset-damaged': 'damage',
  'date-unreadable': 'damage',
  'address-unreadable': 'damage',
  'from-missing': 'damage',
  'form-unreadable': 'damage',
  'field-unreadable': 'damage',
  'part-unreadable': 'damage',
  'text-unreadable': 'damage',
  // Something a person would not see as the program does.
  'hidden-text': 'deceit',
  'alternatives-differ': 'deceit',
  'control-characters': 'deceit',
  'direction-override': 'deceit',
  'invisible-characters': 'deceit',
  'mixed-script-word': 'deceit',
  'line-break-in-header': 'deceit',
  'header-repeated': 'deceit',
  'loop-suspected': 'deceit',
  'form-suspect': 'deceit',
  // Worth knowing, nothing wrong.
  'text-in-attachment': 'note',
  'text-missing': 'note',
  encrypted: 'note',
  'opaque-signed': 'note',
  'outlook-container': 'note',
} as const satisfies Record<string, DefectKind>;

export type DefectCode = keyof typeof defectKinds;

/** Collects defects, each (code, place) once, a bounded number. */
export class Defects {
  readonly #seen = new Set<string>();
  readonly #list: Defect[] = [];

  add(code: DefectCode, place: string): void {
    const key = `${code} ${place}`;
    if (this.#seen.has(key)) return;
    if (this.#list.length === bounds.defectsMax - 1) {
      // The last place is kept for saying that there were more.
      this.#seen.add('defects-cut message');
      this.#list.push({ code: 'defects-cut', place: 'message' });
    }
    if (this.#list.length >= bounds.defectsMax) return;
    this.#seen.add(key);
    this.#list.push({ code, place });
  }

  get list(): readonly Defect[] {
    return this.#list;
  }
}
