import { describe, expect, test } from 'vitest';
import { hashPassword, passwordProblem, verifyPassword } from '@/lib/identity/password';

const ABOUT = ['Dr Solveig Adeyemi', 'solveig@harrowmere.example', 'Harrowmere General Hospital'];
const problem = (password: string) => passwordProblem(password, ABOUT);

describe('a password', () => {
  test.each([
    'violet ladder seven herons',
    'tangerine otter quarry',
    '8391-5820-1749',
    'kX9!vQ2#mP7z',
    'Übergänge im Nebel',
    'my password is about herons',
    '海のそばの古い灯台の階段の上',
  ])('%s will do', (password) => {
    expect(problem(password)).toBeNull();
  });

  test.each([
    'password1234',
    'Password2026!',
    'P@ssw0rd2026',
    'passwordpassword',
    '123456789012',
    'abcdefghijklm',
    '000111222333444',
    'qwertyuiop123',
    'iloveyou1234',
    'Welcome2024!!',
    'administrator1',
    'letmein letmein',
    'correcthorsebatterystaple',
    'Winter2026!!!',
  ])('%s is what a guesser tries first', (password) => {
    expect(problem(password)).toContain('guesser');
  });

  test.each(['solveigadeyemi', 'Harrowmere2026!', 'adeyemi.solveig', 'general-hospital-1'])(
    '%s is the person or the place',
    (password) => {
      expect(problem(password)).not.toBeNull();
    },
  );

  test('has at least twelve and at most 128 characters', () => {
    expect(problem('kX9!vQ2#mP7')).toContain('At least 12');
    expect(problem('violet ladder seven herons'.repeat(6))).toContain('At most 128');
  });

  test('of one character over and over will not do', () => {
    expect(problem('zqzqzqzqzqzqzqzq')).toContain('different');
  });
});

describe('the stored hash', () => {
  test('is Argon2id with at least 19 MiB and two passes, and another one each time', async () => {
    const [first, second] = await Promise.all([hashPassword('x'.repeat(12)), hashPassword('x'.repeat(12))]);
    // PHC string format: $argon2id$v=19$m=…,t=…,p=…
    const [, memory, passes] = /^\$argon2id\$v=19\$m=(\d+),t=(\d+),p=1\$/.exec(first) ?? [];
    expect(Number(memory)).toBeGreaterThanOrEqual(19_456);
    expect(Number(passes)).toBeGreaterThanOrEqual(2);
    expect(second).not.toBe(first);
  });

  test('is matched by its password and by no other', async () => {
    const stored = await hashPassword('violet ladder');
    expect(await verifyPassword(stored, 'violet ladder')).toBe(true);
    expect(await verifyPassword(stored, 'violet ladde')).toBe(false);
    expect(await verifyPassword(stored, '')).toBe(false);
  });
});
