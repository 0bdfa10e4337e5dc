import { CustodyError } from './errors';
import { type Hash, hex, nodeHash, sameBytes } from './hash';

// Sizes are counted in doubles, exact to 2^53: bit operations of the language would cut them at 2^32.
const isOdd = (n: number): boolean => n % 2 === 1;
const half = (n: number): number => Math.floor(n / 2);
const isCount = (n: number): boolean => Number.isSafeInteger(n) && n >= 0;

function checkPath(path: readonly Hash[]): void {
  for (const [i, hash] of path.entries())
    if (hash.length !== 32) throw new CustodyError('proof-hash', `hash ${i} of the path is not of 32 bytes`);
}

/**
 * Root of the log that an inclusion proof leads to (RFC 9162, 2.1.3.2).
 *
 * @param leaf leaf hash, 32 bytes
 * @param index zero-based position of the entry: its sequence number
 * @param size entries in the tree
 * @param path sibling hashes, leaf first, 32 bytes each
 * @returns 32-byte root. It proves nothing until it equals the root in a signed head
 * @throws CustodyError `proof-index` outside the tree, `proof-length` too many or too few hashes, `proof-hash` one that
 *   is not of 32 bytes
 */
export async function rootFromInclusion(
  leaf: Hash,
  index: number,
  size: number,
  path: readonly Hash[],
): Promise<Hash> {
  if (!isCount(index) || !isCount(size) || index >= size)
    throw new CustodyError('proof-index', `entry ${index} is not in a tree of ${size}`);
  if (leaf.length !== 32) throw new CustodyError('proof-hash', 'the leaf hash is not of 32 bytes');
  checkPath(path);
  let at = index;
  let last = size - 1;
  let root = leaf;
  for (const sibling of path) {
    if (last === 0) throw new CustodyError('proof-length', 'the path is longer than the tree is high');
    if (isOdd(at) || at === last) {
      root = await nodeHash(sibling, root);
      while (!isOdd(at) && at !== 0) {
        at = half(at);
        last = half(last);
      }
    } else root = await nodeHash(root, sibling);
    at = half(at);
    last = half(last);
  }
  if (last !== 0) throw new CustodyError('proof-length', 'the path is shorter than the tree is high');
  return root;
}

/**
 * On which side of the entry's own hash each hash of its path stands, leaf first (RFC 9162, 2.1.3.2): for showing a
 * path, not for proving by it. As long as the path is.
 */
export function sidesOfPath(index: number, size: number): ('left' | 'right')[] {
  const sides: ('left' | 'right')[] = [];
  let at = index;
  let last = size - 1;
  while (last > 0) {
    if (isOdd(at) || at === last) {
      sides.push('left');
      while (!isOdd(at) && at !== 0) {
        at = half(at);
        last = half(last);
      }
    } else sides.push('right');
    at = half(at);
    last = half(last);
  }
  return sides;
}

/**
 * That an entry is in the tree of a head (RFC 9162, 2.1.3.2).
 *
 * @throws CustodyError as rootFromInclusion, and `proof-root` where the path leads to another root
 */
export async function verifyInclusion(
  leaf: Hash,
  index: number,
  size: number,
  path: readonly Hash[],
  root: Hash,
): Promise<void> {
  const computed = await rootFromInclusion(leaf, index, size, path);
  if (!sameBytes(computed, root))
    throw new CustodyError('proof-root', `the path leads to ${hex(computed)}, the head says ${hex(root)}`);
}

/**
 * That the tree of a later head holds the whole tree of an earlier one, unchanged and in order (RFC 9162, 2.1.4.2).
 * Nothing is proven about an empty tree: it is refused.
 *
 * @param path hashes of the proof, in the order of the RFC, 32 bytes each
 * @throws CustodyError `proof-size` sizes that have no proof, `proof-length`, `proof-hash`, and `proof-root` where the
 *   path does not lead to both roots
 */
export async function verifyConsistency(
  from: number,
  to: number,
  path: readonly Hash[],
  fromRoot: Hash,
  toRoot: Hash,
): Promise<void> {
  if (!isCount(from) || !isCount(to) || from === 0 || from > to)
    throw new CustodyError('proof-size', `no tree of ${to} can follow one of ${from}`);
  checkPath(path);
  if (from === to) {
    if (path.length > 0) throw new CustodyError('proof-length', 'two trees of one size need no path');
    if (!sameBytes(fromRoot, toRoot))
      throw new CustodyError('proof-root', `two roots of ${to} entries: ${hex(fromRoot)} and ${hex(toRoot)}`);
    return;
  }
  const roots = await rootsFromConsistency(from, to, path, fromRoot);
  if (!sameBytes(roots.from, fromRoot))
    throw new CustodyError('proof-root', `the path leads to ${hex(roots.from)} for ${from} entries`);
  if (!sameBytes(roots.to, toRoot))
    throw new CustodyError('proof-root', `the path leads to ${hex(roots.to)} for ${to} entries`);
}

async function rootsFromConsistency(
  from: number,
  to: number,
  path: readonly Hash[],
  fromRoot: Hash,
): Promise<{ from: Hash; to: Hash }> {
  if (path.length === 0) throw new CustodyError('proof-length', 'the path is empty');
  let fn = from - 1;
  let sn = to - 1;
  while (isOdd(fn)) {
    fn = half(fn);
    sn = half(sn);
  }
  // A size that is a power of two: its root is itself the first hash, and is left out of the path. At this point the
  // shifts have taken all of `from` away.
  const hashes = fn === 0 ? [fromRoot, ...path] : path;
  const [first, ...rest] = hashes as [Hash, ...Hash[]];
  let fr = first;
  let sr = first;
  for (const hash of rest) {
    if (sn === 0) throw new CustodyError('proof-length', 'the path is longer than the tree is high');
    if (isOdd(fn) || fn === sn) {
      fr = await nodeHash(hash, fr);
      sr = await nodeHash(hash, sr);
      while (!isOdd(fn) && fn !== 0) {
        fn = half(fn);
        sn = half(sn);
      }
    } else sr = await nodeHash(sr, hash);
    fn = half(fn);
    sn = half(sn);
  }
  if (sn !== 0) throw new CustodyError('proof-length', 'the path is shorter than the tree is high');
  return { from: fr, to: sr };
}
