import { readFileSync } from 'node:fs';
import { expect, test } from 'vitest';
import { fromBase32, hotp, totp } from '@/tests/support/totp';

const vectors = JSON.parse(readFileSync('tests/reference/otp/rfc4226-rfc6238.json', 'utf8')) as {
  hotp: { secretAscii: string; codes: string[] };
  totp: {
    secretsAscii: Record<string, string>;
    secretSha1Base32: string;
    codes: { time: number; alg: string; code: string }[];
  };
};

// RFC 4226, appendix D.
test('the authenticator of these tests gives the codes of RFC 4226', () => {
  const key = Buffer.from(vectors.hotp.secretAscii);
  expect(vectors.hotp.codes.map((_, counter) => hotp(key, counter))).toEqual(vectors.hotp.codes);
});

// RFC 6238, appendix B.
test.each(vectors.totp.codes)('the authenticator of these tests gives $code ($alg) at $time s', (row) => {
  const key = Buffer.from(vectors.totp.secretsAscii[row.alg] ?? '');
  expect(totp(key, row.time * 1000, 8, row.alg)).toBe(row.code);
});

test('base32 is read as RFC 4648 writes it', () => {
  expect(Buffer.from(fromBase32(vectors.totp.secretSha1Base32)).toString()).toBe(
    vectors.totp.secretsAscii.sha1,
  );
});
