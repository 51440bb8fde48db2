import { domainToASCII } from 'node:url';
import addressparser from 'nodemailer/lib/addressparser';
import { bounds } from '../bounds.ts';
import type { Defects } from './defects.ts';
import { type Fields, fieldText } from './fields.ts';
import type { Address } from './message.ts';

/** The first address of From, else of Sender; null when neither can be read. */
export function readSender(fields: Fields, defects: Defects): Address | null {
  for (const name of ['from', 'sender']) {
    for (const value of fields.all(name)) {
      const addresses = readAddresses(value, name, 1, defects);
      if (addresses.length > 0) return addresses[0]!;
    }
  }
  defects.add('from-missing', 'from');
  return null;
}

/** To, Cc, Delivered-To in that order, each address once, a bounded number. */
export function readRecipients(fields: Fields, defects: Defects): readonly Address[] {
  const found = new Map<string, Address>();
  for (const name of ['to', 'cc', 'delivered-to']) {
    for (const value of fields.all(name)) {
      // One more than allowed shows that there were more.
      for (const address of readAddresses(value, name, bounds.recipientsMax + 1, defects)) {
        if (found.has(address.address)) continue;
        if (found.size >= bounds.recipientsMax) {
          defects.add('recipients-cut', name);
          break;
        }
        found.set(address.address, address);
      }
    }
  }
  return [...found.values()];
}

/** One address such as a form's sender gives. */
export function readAddress(text: string): Address | null {
  const address = text.trim();
  const at = address.lastIndexOf('@');
  if (at <= 0 || address.length > bounds.addressCharsMax || /[\s<>]|\p{Cc}/u.test(address)) return null;
  const domain = asciiDomain(address.slice(at + 1));
  if (domain === '' || domain.startsWith('.')) return null;
  return { address: `${address.slice(0, at).toLowerCase()}@${domain}`, domain };
}

/** RFC 5322 section 3.4: mailboxes and groups; display names are not kept. */
function readAddresses(value: string, place: string, countMax: number, defects: Defects): Address[] {
  const list: Address[] = [];
  let isReadable = true;
  for (const { address } of addressparser(withoutObsolete(fieldText(value)), { flatten: true })) {
    if (list.length >= countMax) break;
    if (!address) continue;
    const read = readAddress(address);
    if (read === null) isReadable = false;
    else list.push(read);
  }
  if (!isReadable || (list.length === 0 && value.trim() !== '' && !/^[^@]*:[^@]*;\s*$/.test(value))) {
    defects.add('address-unreadable', place);
  }
  return list;
}

/** RFC 5322 section 4.4: obsolete addresses have white space and comments around their dots. A scanner that leaves
 *  quoted strings alone; display names lose the space after a dot, but names are not kept. */
function withoutObsolete(value: string): string {
  if (!/\(|\s\.|\.\s/.test(value)) return value;
  const kept: string[] = [];
  let plain = '';
  const endPlain = () => {
    kept.push(plain.replace(/\s+/g, ' ').replace(/ ?\. ?/g, '.'));
    plain = '';
  };
  let depth = 0;
  let isQuoted = false;
  for (let i = 0; i < value.length; i++) {
    const character = value[i]!;
    if (character === '\\' && (isQuoted || depth > 0)) {
      if (isQuoted) plain += value.slice(i, i + 2);
      i++;
    } else if (isQuoted) {
      plain += character;
      if (character !== '"') continue;
      isQuoted = false;
      kept.push(plain);
      plain = '';
    } else if (character === '(') depth++;
    else if (character === ')' && depth > 0) depth--;
    else if (depth > 0) continue;
    else if (character === '"') {
      endPlain();
      isQuoted = true;
      plain = '"';
    } else plain += character;
  }
  if (isQuoted) kept.push(plain);
  else endPlain();
  // An unclosed comment would hide every address behind it.
  return depth > 0 ? value : kept.join('');
}

function asciiDomain(domain: string): string {
  const bare = domain.toLowerCase().replace(/\.$/, '');
  if (/^[a-z0-9](?:[a-z0-9.-]*[a-z0-9])?$/.test(bare)) return bare;
  if (/^\[[\da-f.:a-z-]+\]$/.test(bare)) return bare;
  return domainToASCII(bare);
}
