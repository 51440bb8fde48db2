const months = ['jan', 'feb', 'mar', 'apr', 'may', 'jun', 'jul', 'aug', 'sep', 'oct', 'nov', 'dec'];

/** RFC 5322 section 4.3: the obsolete zones that have a meaning, in minutes; all others count as -0000. */
const namedZones: Readonly<Record<string, number>> = {
  ut: 0,
  gmt: 0,
  utc: 0,
  z: 0,
  edt: -240,
  est: -300,
  cdt: -300,
  cst: -360,
  mdt: -360,
  mst: -420,
  pdt: -420,
  pst: -480,
};

const dateTime =
  /^(?:[a-z]{3,9}\.?\s*,?\s*)?(\d{1,2})[\s-]+([a-z]{3})[a-z]*\.?[\s,-]+(\d{2,4})\s*,?\s+(\d{1,2})\s*:\s*(\d{2})(?:\s*:\s*(\d{2})(?:\.\d{1,9})?)?(?:\s*(?:(?:gmt|utc)?([+-]\d{2}):?(\d{2})|([a-z]{1,5})))?$/i;

/** Reads date-time of RFC 5322 sections 3.3 and 4.3 (comments, two-digit years, named zones); ms since the epoch UTC,
 *  null when it is no date. */
export function readMailDate(value: string): number | null {
  const text = withoutComments(value).trim().slice(0, 100);
  const found = dateTime.exec(text);
  if (!found) return null;
  const [, dayText, monthText, yearText, hourText, minuteText, secondText, zoneHours, zoneMinutes, zoneName] =
    found;
  const month = months.indexOf(monthText!.toLowerCase());
  const year = fullYear(yearText!);
  const [day, hour, minute] = [Number(dayText), Number(hourText), Number(minuteText)];
  // A leap second is counted as the second before.
  const second = Math.min(59, Number(secondText ?? 0));
  if (month < 0 || hour > 23 || minute > 59 || Number(secondText ?? 0) > 60) return null;
  const localMs = Date.UTC(year, month, day, hour, minute, second);
  if (new Date(localMs).getUTCDate() !== day || year < 1900) return null;
  return localMs - zoneOffset(zoneHours, zoneMinutes, zoneName) * 60_000;
}

function fullYear(text: string): number {
  const year = Number(text);
  // RFC 5322 section 4.3: 00 to 49 are 2000 to 2049, 50 to 99 and three digits count from 1900.
  if (text.length === 2) return year < 50 ? 2000 + year : 1900 + year;
  return text.length === 3 ? 1900 + year : year;
}

function zoneOffset(
  hours: string | undefined,
  minutes: string | undefined,
  name: string | undefined,
): number {
  if (hours === undefined) {
    const zone = (name ?? '').toLowerCase();
    return Object.hasOwn(namedZones, zone) ? namedZones[zone]! : 0;
  }
  const size = Math.abs(Number(hours)) * 60 + Number(minutes);
  return hours.startsWith('-') ? -size : size;
}

/** RFC 5322 section 3.2.2: comments nest. A scanner, because an unclosed one must not cost more than its length. */
function withoutComments(value: string): string {
  if (!value.includes('(')) return value;
  let depth = 0;
  let kept = '';
  for (const character of value.slice(0, 500)) {
    if (character === '(') depth++;
    else if (character === ')' && depth > 0) depth--;
    else if (depth === 0) kept += character;
  }
  return kept;
}
