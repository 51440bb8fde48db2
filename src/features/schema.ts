/** What a table counts: the closed slots and the token regions, with a version. Values only. */

export interface SlotSchema {
  readonly id: string;
  /** Exponent group; slots of one group share an exponent. */
  readonly group: string;
  /** Closed list; index 0 is always `missing`, index 1 always `other`. */
  readonly values: readonly string[];
}

export interface RegionSchema {
  readonly id: string;
  /** Most distinct tokens taken from one message. */
  readonly tokensMax: number;
}

export interface Schema {
  /** 16 hex digits over everything below and the token key's fingerprint: tables of another schema are refused. */
  readonly id: string;
  readonly version: number;
  readonly slots: readonly SlotSchema[];
  readonly regions: readonly RegionSchema[];
}

/** Tokens are integers below 2^40: SipHash-2-4 under the desk's secret, cut to 40 bits. Exact in a double. */
export const tokenBits = 40;

/** A token as it is shown and keyed: 10 hex digits. */
export function tokenHex(token: number): string {
  return token.toString(16).padStart(10, '0');
}

/** A message as the model sees it. No words in it. */
export interface Features {
  readonly schema: string;
  /** Shape: [slots]; index into the slot's values. */
  readonly slots: readonly number[];
  /** Shape: [regions][distinct tokens]; ascending. */
  readonly regions: readonly Float64Array[];
}
