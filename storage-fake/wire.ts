import { S3Error } from './errors';

// Strings from the wire are latin1: one character a byte. Bytes are decoded as UTF-8 in one place, `textOf`.

const PERCENT = 0x25;

/**
 * Bytes behind a percent-encoded string (RFC 3986, 2.1).
 *
 * @throws S3Error InvalidURI on a percent sign without two hexadecimal digits
 */
export function percentDecode(wire: string): Buffer {
  const source = Buffer.from(wire, 'latin1');
  if (!source.includes(PERCENT)) return source;
  const target = Buffer.alloc(source.length);
  let length = 0;
  for (let i = 0; i < source.length; i++) {
    let byte = source[i] as number;
    if (byte === PERCENT) {
      const digits = wire.slice(i + 1, i + 3);
      if (!/^[0-9a-fA-F]{2}$/.test(digits))
        throw new S3Error('InvalidURI', "Couldn't parse the specified URI.");
      byte = Number.parseInt(digits, 16);
      i += 2;
    }
    target[length++] = byte;
  }
  return target.subarray(0, length);
}

/**
 * Percent-encode bytes as Signature Version 4 wants it: everything but the unreserved characters of RFC 3986, 2.3,
 * upper-case digits, and `/` left alone only in a path.
 */
export function percentEncode(bytes: Uint8Array, keepSlash = false): string {
  let out = '';
  for (const byte of bytes) {
    const unreserved =
      (byte >= 0x41 && byte <= 0x5a) ||
      (byte >= 0x61 && byte <= 0x7a) ||
      (byte >= 0x30 && byte <= 0x39) ||
      byte === 0x2d ||
      byte === 0x2e ||
      byte === 0x5f ||
      byte === 0x7e ||
      (keepSlash && byte === 0x2f);
    out += unreserved ? String.fromCharCode(byte) : `%${byte.toString(16).toUpperCase().padStart(2, '0')}`;
  }
  return out;
}

const utf8 = new TextDecoder('utf-8', { fatal: true, ignoreBOM: true });

/** @throws S3Error InvalidURI where the bytes are not UTF-8 */
export function textOf(bytes: Uint8Array): string {
  try {
    return utf8.decode(bytes);
  } catch {
    throw new S3Error('InvalidURI', "Couldn't parse the specified URI.");
  }
}

/** One parameter of a query, still bytes; a plus sign is a space, as in a form. */
export interface Parameter {
  name: Buffer;
  value: Buffer;
}

export function splitQuery(rawQuery: string): Parameter[] {
  if (rawQuery === '') return [];
  return rawQuery
    .split('&')
    .filter((pair) => pair !== '')
    .map((pair) => {
      const at = pair.indexOf('=');
      const [name, value] = at < 0 ? [pair, ''] : [pair.slice(0, at), pair.slice(at + 1)];
      const bytes = (text: string) => percentDecode(text.replaceAll('+', ' '));
      return { name: bytes(name), value: bytes(value) };
    });
}

/**
 * Order of keys in a listing: by their UTF-8 bytes. UTF-16 code units give the same order except where a surrogate
 * meets a unit from U+E000 up.
 */
export function compareUtf8(a: string, b: string): number {
  const shared = Math.min(a.length, b.length);
  for (let i = 0; i < shared; i++) {
    const x = a.charCodeAt(i);
    const y = b.charCodeAt(i);
    if (x === y) continue;
    const lifted = (unit: number) => (unit >= 0xd800 && unit <= 0xdfff ? unit + 0x10000 : unit);
    return lifted(x) - lifted(y);
  }
  return a.length - b.length;
}
