import type { Defects } from './defects.ts';
import type { Attachment, AttachmentKind } from './message.ts';
import { isMultipart, isShownText, type Part } from './part.ts';

/** Kind by the ending of the file's name, for the many mailers that send application/octet-stream. */
const kindByEnding: Readonly<Record<string, AttachmentKind>> = Object.fromEntries(
  (
    [
      ['image', 'jpg jpeg jpe png gif bmp tif tiff webp heic heif svg ico'],
      ['pdf', 'pdf'],
      ['document', 'doc docx docm dot dotx odt rtf txt md pages tex wpd ppt pptx pps ppsx odp key'],
      ['sheet', 'xls xlsx xlsm xlsb ods csv tsv numbers'],
      ['archive', 'zip gz tgz bz2 xz 7z rar tar zst cab iso'],
      ['calendar', 'ics ical ifb vcs'],
      ['audio', 'mp3 wav ogg oga m4a aac flac amr opus wma'],
      ['video', 'mp4 mov avi mkv webm mpg mpeg 3gp wmv m4v'],
      ['message', 'eml msg mbox'],
      ['signature', 'p7s asc sig pgp'],
    ] as const
  ).flatMap(([kind, endings]) => endings.split(' ').map((ending) => [ending, kind])),
);

const kindByType: readonly (readonly [RegExp, AttachmentKind])[] = [
  [/^application\/pdf$/, 'pdf'],
  [/^text\/(?:calendar|x-vcalendar)$|^application\/ics$/, 'calendar'],
  [/^application\/(?:pkcs7-signature|x-pkcs7-signature|pgp-signature)$/, 'signature'],
  [/^message\//, 'message'],
  [/^image\//, 'image'],
  [/^audio\//, 'audio'],
  [/^video\//, 'video'],
  [/spreadsheet|ms-?excel|^text\/(?:csv|tab-separated-values)$/, 'sheet'],
  [
    /wordprocessing|ms-?word|opendocument\.text|presentation|powerpoint|^(?:text|application)\/rtf$|^text\//,
    'document',
  ],
  [/zip|compressed|x-(?:tar|gtar|rar|7z)|gzip/, 'archive'],
];

/** Parts that a reader sees as files, in order; text shown in place and multiparts are none. */
export function listAttachments(root: Part, defects: Defects): readonly Attachment[] {
  const found: Attachment[] = [];
  visit(root, (part) => {
    noteContainers(part, defects);
    if (isMultipart(part) || isShownText(part) || part.contentType === 'text/x-amp-html') return;
    if (part.contentType === 'message/rfc822' && part.children.length > 0) {
      found.push({ kind: 'message', bytes: sizeOf(part) });
      return;
    }
    found.push({ kind: kindOf(part), bytes: part.bytes });
  });
  return found;
}

/** Kind of a file by its declared type, else by its name. */
export function kindOf(part: Pick<Part, 'contentType' | 'fileName'>): AttachmentKind {
  const byType = kindByType.find(([pattern]) => pattern.test(part.contentType))?.[1];
  if (byType !== undefined) return byType;
  const ending = /\.([a-z0-9]{1,5})\s*$/i.exec(part.fileName)?.[1]?.toLowerCase() ?? '';
  return Object.hasOwn(kindByEnding, ending) ? kindByEnding[ending]! : 'other';
}

/** Every node of the tree, parents first; the depth is bounded by the reader. */
export function visit(part: Part, see: (part: Part) => void): void {
  see(part);
  for (const child of part.children) visit(child, see);
}

function sizeOf(part: Part): number {
  let bytes = 0;
  visit(part, (inner) => {
    bytes += inner.bytes;
  });
  return bytes;
}

/** Content that only its recipient's program can open: on record, because the words are missing. */
function noteContainers(part: Part, defects: Defects): void {
  const type = part.contentType;
  if (type === 'multipart/encrypted') defects.add('encrypted', part.number);
  else if (/^application\/(?:x-)?pkcs7-mime$/.test(type)) {
    const isSigned = /signed-data/i.test(part.params['smime-type'] ?? '');
    defects.add(isSigned ? 'opaque-signed' : 'encrypted', part.number);
  } else if (/^application\/(?:vnd\.)?ms-tnef$/.test(type) || /^winmail\.dat$/i.test(part.fileName)) {
    defects.add('outlook-container', part.number);
  }
}
