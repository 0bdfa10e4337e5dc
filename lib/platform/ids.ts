import { randomBytes, randomInt, randomUUID } from 'node:crypto';

/** Digits and letters that are not mistaken for one another when read aloud or copied (no 0 O 1 I L U). */
const READABLE = '23456789ABCDEFGHJKMNPQRSTVWXYZ';

/** An identifier nobody reads aloud. */
export const newId = (): string => randomUUID();

/** `length` characters without look-alikes, from the system's random source; about 4.9 bits a character. */
export function readableCode(length: number): string {
  let code = '';
  for (let i = 0; i < length; i++) code += READABLE[randomInt(READABLE.length)];
  return code;
}

/** The number by which people name a recording, such as `7K3F-92QX`. */
export function newRecordingNumber(): string {
  const code = readableCode(8);
  return `${code.slice(0, 4)}-${code.slice(4)}`;
}

/** A secret of `bytes` random bytes, base64url without padding. */
export const newSecret = (bytes = 32): string => randomBytes(bytes).toString('base64url');
