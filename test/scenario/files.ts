import { filePart, type MimePart } from './mime.ts';
import type { Chance } from './random.ts';
import type { QueueId } from './topic.ts';

/** Small invented attachments: the first bytes of each kind, then noise. */
const kinds = {
  photo: { type: 'image/jpeg', ends: 'jpg', magic: [0xff, 0xd8, 0xff, 0xe0, 0, 16, 0x4a, 0x46, 0x49, 0x46] },
  scan: { type: 'application/pdf', ends: 'pdf', magic: [...Buffer.from('%PDF-1.4\n')] },
  document: {
    type: 'application/vnd.openxmlformats-officedocument.wordprocessingml.document',
    ends: 'docx',
    magic: [0x50, 0x4b, 3, 4],
  },
  sheet: {
    type: 'application/vnd.openxmlformats-officedocument.spreadsheetml.sheet',
    ends: 'xlsx',
    magic: [0x50, 0x4b, 3, 4],
  },
  film: { type: 'video/mp4', ends: 'mp4', magic: [0, 0, 0, 24, 0x66, 0x74, 0x79, 0x70] },
  archive: { type: 'application/zip', ends: 'zip', magic: [0x50, 0x4b, 3, 4] },
} as const;
type FileKind = keyof typeof kinds;

const habits: Readonly<Record<QueueId, { share: number; kinds: Partial<Record<FileKind, number>> }>> = {
  billing: { share: 0.15, kinds: { scan: 3, photo: 2 } },
  'meter-readings': { share: 0.35, kinds: { photo: 1 } },
  'moving-home': { share: 0.15, kinds: { scan: 2, document: 1, sheet: 0.5 } },
  'leaks-and-bursts': { share: 0.2, kinds: { photo: 4, film: 1 } },
  'water-quality': { share: 0.2, kinds: { photo: 5, scan: 1 } },
  'sewer-flooding': { share: 0.25, kinds: { photo: 4, film: 1 } },
  'new-connections': { share: 0.5, kinds: { scan: 4, archive: 1, document: 1 } },
  complaints: { share: 0.2, kinds: { photo: 2, scan: 2, document: 1 } },
  careers: { share: 0.7, kinds: { scan: 3, document: 3 } },
  suppliers: { share: 0.6, kinds: { scan: 4, sheet: 1, document: 1 } },
};

export function attachmentsFor(queue: QueueId, chance: Chance): MimePart[] {
  const habit = habits[queue];
  if (!chance.isTrue(habit.share)) return [];
  return Array.from({ length: chance.isTrue(0.15) ? 2 : 1 }, () => {
    const { type, ends, magic } = kinds[chance.weighted<FileKind>(habit.kinds)];
    const noise = Array.from({ length: 60 + chance.below(240) }, () => chance.below(256));
    return filePart(
      type,
      `${chance.pick(['img', 'scan', 'file', 'doc'])}${chance.below(9000)}.${ends}`,
      Uint8Array.from([...magic, ...noise]),
    );
  });
}
