import { hash, verify } from '@node-rs/argon2';

/** OWASP's first recommendation for Argon2id: 19 MiB, two passes, one lane (Password Storage Cheat Sheet, from memory). */
const COST = { memoryCost: 19_456, timeCost: 2, parallelism: 1 };

export const PASSWORD_LENGTH = { least: 12, most: 128 } as const;

export const hashPassword = (password: string): Promise<string> => hash(password, COST);
export const verifyPassword = (stored: string, password: string): Promise<boolean> =>
  verify(stored, password);

/** Words that guessers try first; a password that is one of them with digits around it is refused. */
const COMMON = [
  'password',
  'passwort',
  'qwertyuiop',
  'letmein',
  'welcome',
  'iloveyou',
  'administrator',
  'changeme',
  'hospital',
  'bellkeep',
  'stethoscope',
  'trustno',
];

/**
 * Why a password will not do; null when it will. Length and a short list of what is guessed first, no rules about
 * kinds of characters (NIST SP 800-63B, 5.1.1.2).
 *
 * @param about words of the person and the place that a guesser would try
 */
export function passwordProblem(password: string, about: readonly string[]): string | null {
  if (password.length < PASSWORD_LENGTH.least)
    return `At least ${PASSWORD_LENGTH.least} characters. Three or four words that have nothing to do with each other are easy to keep.`;
  if (password.length > PASSWORD_LENGTH.most) return `At most ${PASSWORD_LENGTH.most} characters.`;
  const bare = password.toLowerCase().replace(/[^a-z]/g, '');
  if (COMMON.some((word) => bare === word || bare === word + word))
    return 'This is one of the first that a guesser tries.';
  if (new Set(password).size < 5) return 'Too few different characters.';
  const own = about
    .flatMap((words) => words.toLowerCase().split(/[^a-z]+/))
    .filter((word) => word.length >= 4);
  if (own.some((word) => bare === word || bare === word + word))
    return 'Not your own name, address or hospital.';
  return null;
}
