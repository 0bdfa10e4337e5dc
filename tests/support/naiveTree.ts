import { createHash } from 'node:crypto';

const sha256 = (...parts: Uint8Array[]) => {
  const hash = createHash('sha256');
  for (const part of parts) hash.update(part);
  return new Uint8Array(hash.digest());
};

export const naiveLeaf = (entry: Uint8Array) => sha256(Uint8Array.of(0), entry);

const split = (n: number) => {
  let k = 1;
  while (k * 2 < n) k *= 2;
  return k;
};

/** Merkle tree hash straight from the definition (RFC 9162, 2.1.1): slow, and easy to be sure of. */
export function naiveRoot(leaves: readonly Uint8Array[]): Uint8Array {
  if (leaves.length === 0) return sha256();
  if (leaves.length === 1) return leaves[0] as Uint8Array;
  const k = split(leaves.length);
  return sha256(Uint8Array.of(1), naiveRoot(leaves.slice(0, k)), naiveRoot(leaves.slice(k)));
}

/** Inclusion path straight from the definition (RFC 9162, 2.1.3.1). */
export function naiveInclusion(index: number, leaves: readonly Uint8Array[]): Uint8Array[] {
  if (leaves.length <= 1) return [];
  const k = split(leaves.length);
  return index < k
    ? [...naiveInclusion(index, leaves.slice(0, k)), naiveRoot(leaves.slice(k))]
    : [...naiveInclusion(index - k, leaves.slice(k)), naiveRoot(leaves.slice(0, k))];
}

/** Consistency path straight from the definition (RFC 9162, 2.1.4.1). */
export function naiveConsistency(from: number, leaves: readonly Uint8Array[], whole = true): Uint8Array[] {
  if (from === leaves.length) return whole ? [] : [naiveRoot(leaves)];
  const k = split(leaves.length);
  return from <= k
    ? [...naiveConsistency(from, leaves.slice(0, k), whole), naiveRoot(leaves.slice(k))]
    : [...naiveConsistency(from - k, leaves.slice(k), false), naiveRoot(leaves.slice(0, k))];
}
