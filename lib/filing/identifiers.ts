import { z } from 'zod';

/** Two identifiers, as read from the wristband or heard from the patient. Common practice, no source. */
export const Identifiers = z.strictObject({
  recordNumber: z.string().trim().min(1).max(64),
  /** Date of birth or family name. */
  second: z.string().trim().min(1).max(120),
});
export type Identifiers = z.infer<typeof Identifiers>;

/** Letters that Unicode does not take apart (NFKD) and that keyboards often lack. */
const FOLDED: Record<string, string> = {
  ß: 'ss',
  æ: 'ae',
  œ: 'oe',
  ø: 'o',
  đ: 'd',
  ð: 'd',
  ł: 'l',
  ı: 'i',
  þ: 'th',
};

const plain = (text: string): string =>
  text
    .normalize('NFKD')
    .replace(/\p{M}/gu, '')
    .toLowerCase()
    .replace(/[ßæœøđðłıþ]/g, (letter) => FOLDED[letter] ?? letter)
    .replace(/[^\p{L}\p{N}]/gu, '');

/** Texts without a letter or digit are equal to nothing, not even to each other. */
const same = (a: string, b: string): boolean => plain(a) !== '' && plain(a) === plain(b);

const MONTHS = ['jan', 'feb', 'mar', 'apr', 'may', 'jun', 'jul', 'aug', 'sep', 'oct', 'nov', 'dec'];
const iso = (year: string, month: number, day: string): string =>
  `${year}-${String(month).padStart(2, '0')}-${day.padStart(2, '0')}`;

/**
 * A whole date as people write it, as YYYY-MM-DD: `1951-03-14`, `19510314`, `14 Mar 1951`, `14.3.1951`, `14/03/1951`.
 * Day before month, as wristbands here have it: 3/4/1951 is the third of April and nothing else.
 */
export function dateAsWritten(text: string): string | null {
  const word = text.trim().toLowerCase();
  const ordered = /^(\d{4})-?(\d{2})-?(\d{2})$/.exec(word);
  if (ordered) return iso(ordered[1] ?? '', Number(ordered[2]), ordered[3] ?? '');
  const figures = /^(\d{1,2})\s*[./\s-]\s*(\d{1,2})\s*[./\s-]\s*(\d{4})$/.exec(word);
  if (figures) return iso(figures[3] ?? '', Number(figures[2]), figures[1] ?? '');
  const named = /^(\d{1,2})\.?\s*([a-z]{3,9})\.?,?\s*(\d{4})$/.exec(word);
  const month = MONTHS.indexOf(named?.[2]?.slice(0, 3) ?? '') + 1;
  return named && month > 0 ? iso(named[3] ?? '', month, named[1] ?? '') : null;
}

/**
 * Whether the identifiers are this patient's, however they were spaced, cased or accented. A birth date that the
 * record system knows only in part (FHIR R4, date) identifies nobody: then the family name is needed.
 */
export function identifiersMatch(
  given: Identifiers,
  who: { recordNumber: string; familyName: string; birthDate: string | null },
): boolean {
  if (!same(given.recordNumber, who.recordNumber)) return false;
  if (same(given.second, who.familyName)) return true;
  return who.birthDate?.length === 10 && dateAsWritten(given.second) === who.birthDate;
}
