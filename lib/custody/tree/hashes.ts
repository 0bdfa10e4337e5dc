import { createHash } from 'node:crypto';

/** Node hash (RFC 9162, 2.1.1) without waiting, for where millions are made. */
export const nodeHashNow = (left: Uint8Array, right: Uint8Array): Uint8Array =>
  createHash('sha256')
    .update(Buffer.from([1]))
    .update(left)
    .update(right)
    .digest();

/** Leaf hash (RFC 9162, 2.1.1): SHA-256(0x00 || entry). @param canonical the entry as RFC 8785 JSON */
export const leafHashNow = (canonical: string): Uint8Array =>
  createHash('sha256')
    .update(Buffer.from([0]))
    .update(canonical, 'utf8')
    .digest();

/** Hash of a tree from its complete subtrees, left to right: they fold from the right. */
export function foldHashes(hashes: readonly Uint8Array[]): Uint8Array {
  const last = hashes.at(-1);
  if (last === undefined) return createHash('sha256').digest();
  let root = last;
  for (let i = hashes.length - 2; i >= 0; i--) root = nodeHashNow(hashes[i] as Uint8Array, root);
  return root;
}
