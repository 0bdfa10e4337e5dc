/** Hashes of the log (RFC 6962, 2.1; RFC 9162, 2.1.1), with WebCrypto so that a browser checks with the same code. */

/** 32 bytes. */
export type Hash = Uint8Array;

/** SHA-256 (FIPS 180-4). */
export const sha256 = async (bytes: Uint8Array): Promise<Hash> =>
  new Uint8Array(await crypto.subtle.digest('SHA-256', bytes as Uint8Array<ArrayBuffer>));

/** Leaf hash: SHA-256(0x00 || entry). @param entry canonical JSON of the entry, UTF-8 */
export function leafHash(entry: Uint8Array): Promise<Hash> {
  const input = new Uint8Array(entry.length + 1);
  input.set(entry, 1);
  return sha256(input);
}

/** Node hash: SHA-256(0x01 || left || right). */
export function nodeHash(left: Hash, right: Hash): Promise<Hash> {
  const input = new Uint8Array(1 + left.length + right.length);
  input[0] = 1;
  input.set(left, 1);
  input.set(right, 1 + left.length);
  return sha256(input);
}

/** Hash of the empty tree: SHA-256 of nothing. */
export const emptyRoot = (): Promise<Hash> => sha256(new Uint8Array(0));

export const hex = (bytes: Uint8Array): string =>
  Array.from(bytes, (b) => b.toString(16).padStart(2, '0')).join('');

/** Bytes of lower- or upper-case hex; null where it is none. */
export function fromHex(text: string): Uint8Array | null {
  if (!/^(?:[0-9a-f]{2})*$/i.test(text)) return null;
  return Uint8Array.from(text.match(/../g) ?? [], (pair) => Number.parseInt(pair, 16));
}

export const sameBytes = (a: Uint8Array, b: Uint8Array): boolean =>
  a.length === b.length && a.every((byte, i) => byte === b[i]);
