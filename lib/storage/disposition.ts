const NAME_CHARACTERS_MAX = 150;

/** Characters that RFC 8187, 3.2.1 lets stand (`attr-char`). */
const encodeExtended = (text: string): string =>
  encodeURIComponent(text).replace(/['()*]/g, (char) => `%${char.charCodeAt(0).toString(16).toUpperCase()}`);

/**
 * A Content-Disposition that makes a browser save and never show (RFC 6266), with the name twice: plain for old
 * readers, and in UTF-8 as RFC 8187 has it. Path parts, control and direction characters are taken out of the name,
 * as RFC 6266, 4.3 asks of the one who saves.
 *
 * @returns ASCII only
 */
export function attachmentDisposition(filename: string): string {
  // Cs: half a surrogate pair, which has no encoding.
  const safe = [...filename]
    .map((char) => (/[\p{Cc}\p{Cf}\p{Cs}\p{Zl}\p{Zp}/\\:]/u.test(char) ? '_' : char))
    .slice(0, NAME_CHARACTERS_MAX)
    .join('')
    .replace(/^[. ]+/, '');
  const name = safe === '' ? 'file' : safe;
  const plain = name.replace(/[^\u0020-\u007e]|["%;]/gu, '_');
  return `attachment; filename="${plain}"; filename*=UTF-8''${encodeExtended(name)}`;
}
