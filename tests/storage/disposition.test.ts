import { expect, test } from 'vitest';
import { attachmentDisposition } from '@/lib/storage/disposition';

// RFC 6266 (the header), RFC 8187 (the name in UTF-8), RFC 9110, 5.6.4 (quoted strings).

const nameIn = (header: string): string =>
  decodeURIComponent(/filename\*=UTF-8''(.*)$/.exec(header)?.[1] ?? '');

test.each([
  ['clip.wav', 'clip.wav'],
  ['Bett 7, früh.wav', 'Bett 7, früh.wav'],
  ['../../etc/passwd', '_.._etc_passwd'],
  ['C:\\temp\\x.wav', 'C__temp_x.wav'],
  ['a\r\nSet-Cookie: b', 'a__Set-Cookie_ b'],
  ['gpj.\u202eexe.wav', 'gpj._exe.wav'],
  ['.hidden', 'hidden'],
  ['...', 'file'],
  ['', 'file'],
  ['half \ud83c pair', 'half _ pair'],
  ['\u{1f3b5}.wav', '\u{1f3b5}.wav'],
])('%j is saved as %j', (given, saved) => {
  const header = attachmentDisposition(given);
  expect(nameIn(header)).toBe(saved);
  expect(header).toMatch(
    /^attachment; filename="[\x20-\x7e]*"; filename\*=UTF-8''[A-Za-z0-9%!#$&+.^_`|~-]*$/,
  );
  // Nothing can end the quoted string early.
  expect(header.split('"')).toHaveLength(3);
});

test('a name of ten thousand characters is cut', () => {
  expect([...nameIn(attachmentDisposition('\u{1f3b5}'.repeat(10_000)))]).toHaveLength(150);
});
