import { createHmac } from 'node:crypto';

/**
 * An authenticator of our own, so that the one under test is held against something else.
 *
 * RFC 4226, 5.3: HMAC of the counter (8 bytes, big-endian), dynamic truncation, modulo 10^digits.
 */
export function hotp(key: Uint8Array, counter: number, digits = 6, algorithm = 'sha1'): string {
  const message = Buffer.alloc(8);
  message.writeBigUInt64BE(BigInt(counter));
  const mac = createHmac(algorithm, key).update(message).digest();
  const offset = mac.readUInt8(mac.length - 1) & 0xf;
  return String((mac.readUInt32BE(offset) & 0x7fffffff) % 10 ** digits).padStart(digits, '0');
}

/** RFC 6238, 4.2: the counter is the number of whole steps of 30 s since 1970. */
export const totp = (key: Uint8Array, atMs: number, digits = 6, algorithm = 'sha1'): string =>
  hotp(key, Math.floor(atMs / 30_000), digits, algorithm);

/** RFC 4648, 6, without padding. */
export function fromBase32(text: string): Uint8Array {
  const bits = [...text.toUpperCase()]
    .map((letter) => 'ABCDEFGHIJKLMNOPQRSTUVWXYZ234567'.indexOf(letter).toString(2).padStart(5, '0'))
    .join('');
  const bytes = bits.match(/.{8}/g) ?? [];
  return Uint8Array.from(bytes, (byte) => Number.parseInt(byte, 2));
}
