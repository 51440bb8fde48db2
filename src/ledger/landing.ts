import type { HasAbsorbed } from './absorbed.ts';
import { isLanded } from './history.ts';
import { isNamed, isOutdated, isVoid, type Manifest } from './manifest.ts';

/** What a writer finds when it comes to commit its own segment. */
export type Outlook =
  /** An earlier attempt landed, though its answer was lost. */
  | 'landed'
  /** Voided by a process that took its messages over, below the floor, or worked out before a restore: never to land. */
  | 'refused'
  | 'free';

/** `hasAbsorbed` is needed only when an earlier attempt may have landed; null: none was made. */
export function landingOf(
  manifest: Manifest,
  segment: string,
  readAtVersion: number,
  hasAbsorbed: HasAbsorbed | null,
): Outlook {
  if (isNamed(manifest, segment) || hasAbsorbed?.(segment)) return 'landed';
  return isVoid(manifest, segment) || isOutdated(manifest, readAtVersion) ? 'refused' : 'free';
}

/** Those of `segments` that could still land: they must be voided before their messages are taken over. */
export function openAmong(
  segments: Iterable<string>,
  manifest: Manifest,
  hasAbsorbed: HasAbsorbed,
): string[] {
  return [...segments].filter((id) => !isLanded(manifest, hasAbsorbed, id) && !isVoid(manifest, id));
}
