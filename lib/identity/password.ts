import { hash, verify } from '@node-rs/argon2';
import { COMMON_WORDS } from './commonWords';

/** OWASP's first recommendation for Argon2id: 19 MiB, two passes, one lane (Password Storage Cheat Sheet, from memory). */
const COST = { memoryCost: 19_456, timeCost: 2, parallelism: 1 };

export const PASSWORD_LENGTH = { least: 12, most: 128 } as const;
/** What must be left of a password beside what a guesser tries first. */
const OWN_PART = 6;

export const hashPassword = (password: string): Promise<string> => hash(password, COST);
export const verifyPassword = (stored: string, password: string): Promise<boolean> =>
  verify(stored, password);

const LETTERS_FOR: Record<string, string> = {
  '@': 'a',
  '4': 'a',
  '3': 'e',
  '1': 'i',
  '!': 'i',
  '0': 'o',
  $: 's',
  '5': 's',
  '7': 't',
};
const withLetters = (text: string): string =>
  text.replace(/[@431!0$57]/g, (sign) => LETTERS_FOR[sign] ?? sign);

/** Characters that follow each other, up, down or standing still, three or more: 1234, cba, 000. */
function withoutRuns(text: string): string {
  let kept = '';
  let start = 0;
  const step = (i: number) => text.charCodeAt(i + 1) - text.charCodeAt(i);
  while (start < text.length) {
    let end = start;
    while (end + 1 < text.length && Math.abs(step(end)) <= 1 && (end === start || step(end) === step(start)))
      end++;
    if (end - start < 2) kept += text[start];
    start = end - start < 2 ? start + 1 : end + 1;
  }
  return kept;
}

/** What is left when everything is taken away that a guesser tries first. */
function ownPart(text: string, words: readonly string[]): string {
  const rest = words.reduce((left, word) => left.replaceAll(word, ''), text);
  return withoutRuns(rest.replace(/(?:19|20)\d\d/g, '')).replace(/[\s\p{P}]/gu, '');
}

/**
 * Why a password will not do; null when it will. Length, and what is guessed first; no rules about kinds of characters
 * (NIST SP 800-63B, 5.1.1.2).
 *
 * @param about words of the person and the place that a guesser would try
 */
export function passwordProblem(password: string, about: readonly string[]): string | null {
  if (password.length < PASSWORD_LENGTH.least)
    return `At least ${PASSWORD_LENGTH.least} characters. Three or four words that have nothing to do with each other are easy to keep.`;
  if (password.length > PASSWORD_LENGTH.most) return `At most ${PASSWORD_LENGTH.most} characters.`;
  const lower = password.toLowerCase();
  if (new Set(lower).size < 5) return 'Too few different characters.';
  const own = about
    .flatMap((words) => words.toLowerCase().split(/[^\p{L}\p{N}]+/u))
    .filter((word) => word.length >= 4);
  const tooLittle = (words: readonly string[]) =>
    ownPart(lower, words).length < OWN_PART || ownPart(withLetters(lower), words).length < OWN_PART;
  if (tooLittle(COMMON_WORDS)) return 'This is one of the first that a guesser tries.';
  if (tooLittle([...own, ...COMMON_WORDS])) return 'Too much of it is your own name, address or hospital.';
  return null;
}
