import type { Features, Schema, SlotSchema } from './schema.ts';

/** Features under another schema of the same token key, for a message whose raw form is gone: tokens are the same; a slot keeps
 *  its value by name, `other` where the new list does not have it, and `missing` where the slot is new.
 *  Null when the tokens are not drawn alike: then only the message itself can tell. */
export function translateFeatures(features: Features, from: Schema, to: Schema): Features | null {
  const areDrawnAlike =
    from.version === to.version && JSON.stringify(from.regions) === JSON.stringify(to.regions);
  if (!areDrawnAlike || features.schema !== from.id) return null;
  const before = new Map(from.slots.map((slot, j) => [slot.id, { slot, value: features.slots[j]! }]));
  const slots = to.slots.map((slot) => {
    const known = before.get(slot.id);
    return known === undefined ? 0 : valueIn(slot, known.slot, known.value);
  });
  return { schema: to.id, slots, regions: features.regions };
}

/** Index 0 is `missing` and 1 `other` in every list. */
function valueIn(to: SlotSchema, from: SlotSchema, value: number): number {
  if (value < 2) return value;
  const at = to.values.indexOf(from.values[value]!, 2);
  return at === -1 ? 1 : at;
}
