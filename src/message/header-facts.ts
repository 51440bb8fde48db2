import type { Fields } from './fields.ts';
import type { HeaderFacts, Verdict } from './message.ts';
import type { Part } from './part.ts';

/** The facts that routing may use, from the header of the message itself. */
export function readHeaderFacts(fields: Fields, root: Part): HeaderFacts {
  return {
    isReply: /\S/.test(fields.first('in-reply-to')) || /\S/.test(fields.first('references')),
    isAutomatic: isAutomatic(fields),
    isList: /\S/.test(fields.first('list-id')),
    isDeliveryReport:
      root.contentType === 'multipart/report' &&
      (root.params['report-type'] ?? '').trim().toLowerCase() === 'delivery-status',
    spam: readVerdict(fields.first('x-ses-spam-verdict')),
    virus: readVerdict(fields.first('x-ses-virus-verdict')),
  };
}

/** RFC 3834 section 5: any keyword but `no`; parameters and comments may follow. RFC 5321 section 4.5.5: automatic
 *  notices carry a null return path. */
function isAutomatic(fields: Fields): boolean {
  const keyword = fields
    .first('auto-submitted')
    .replace(/\([^()]*\)/g, ' ')
    .split(';', 1)[0]!
    .trim()
    .toLowerCase();
  if (keyword !== '' && keyword !== 'no') return true;
  return /^<\s*>$/.test(fields.first('return-path').trim());
}

/** Verdicts as the receiving service writes them, on top of the header: the first field is its own. */
function readVerdict(value: string): Verdict {
  switch (value.trim().toUpperCase()) {
    case 'PASS':
      return 'pass';
    case 'FAIL':
      return 'fail';
    case 'GRAY':
      return 'gray';
    case 'PROCESSING_FAILED':
      return 'failed';
    default:
      return 'missing';
  }
}
