/**
 * The shape of the tree (RFC 9162, 2.1.1): which stored subtrees a proof is made of. A complete subtree at `level` and
 * `position` covers the entries from `position * 2^level` on, 2^level of them; level 0 are the leaves.
 */
export interface Place {
  level: number;
  position: number;
}

/** Largest power of two below n, for n > 1. */
function split(n: number): number {
  let k = 1;
  while (k * 2 < n) k *= 2;
  return k;
}

/**
 * Complete subtrees, left to right, that the tree over entries `start` up to `end` folds from. `start` is a multiple of
 * a power of two that is at least the length, as it is for every part of a proof.
 */
export function placesOfRange(start: number, end: number): Place[] {
  const places: Place[] = [];
  for (let at = start; at < end; ) {
    let level = 0;
    let width = 1;
    while (at + width * 2 <= end) {
      width *= 2;
      level++;
    }
    places.push({ level, position: at / width });
    at += width;
  }
  return places;
}

/** Parts of an inclusion path (RFC 9162, 2.1.3.1), leaf first; each folds to one hash of the path. */
export function inclusionParts(index: number, size: number): Place[][] {
  const parts: Place[][] = [];
  let start = 0;
  let end = size;
  while (end - start > 1) {
    const middle = start + split(end - start);
    if (index < middle) {
      parts.unshift(placesOfRange(middle, end));
      end = middle;
    } else {
      parts.unshift(placesOfRange(start, middle));
      start = middle;
    }
  }
  return parts;
}

/** Parts of a consistency path (RFC 9162, 2.1.4.1), in its order. `0 < from <= to`. */
export function consistencyParts(from: number, to: number): Place[][] {
  const parts: Place[][] = [];
  let start = 0;
  let end = to;
  let whole = true;
  while (from < end) {
    const middle = start + split(end - start);
    if (from <= middle) {
      parts.unshift(placesOfRange(middle, end));
      end = middle;
    } else {
      parts.unshift(placesOfRange(start, middle));
      start = middle;
      whole = false;
    }
  }
  // The old tree's own rightmost part comes first, unless it is the old tree's root itself.
  if (!whole) parts.unshift(placesOfRange(start, end));
  return parts;
}
