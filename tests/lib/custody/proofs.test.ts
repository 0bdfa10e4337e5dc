import { readFileSync } from 'node:fs';
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { CustodyError } from '@/lib/custody/pure/errors';
import { fromHex, hex } from '@/lib/custody/pure/hash';
import {
  rootFromInclusion,
  sidesOfPath,
  verifyConsistency,
  verifyInclusion,
} from '@/lib/custody/pure/proofs';
import { consistencyParts, inclusionParts, type Place, placesOfRange } from '@/lib/custody/pure/shape';
import { foldHashes, nodeHashNow } from '@/lib/custody/tree/hashes';
import { naiveConsistency, naiveInclusion, naiveLeaf, naiveRoot } from '@/tests/support/naiveTree';

const read = <T>(name: string): T =>
  JSON.parse(readFileSync(`tests/reference/merkle/${name}.json`, 'utf8')) as T;
const bytes = (base64: string) => new Uint8Array(Buffer.from(base64, 'base64'));
const unhex = (text: string) => fromHex(text) as Uint8Array;

/** What became of a check: `accepted`, or the code of the refusal. */
const outcome = async (check: Promise<unknown>): Promise<string> => {
  try {
    await check;
    return 'accepted';
  } catch (error) {
    if (error instanceof CustodyError) return error.code;
    throw error;
  }
};

interface Vector {
  desc: string;
  wantErr: boolean;
  file: string;
  proof: string[] | null;
}

describe('published proofs (transparency-dev/merkle)', () => {
  test('inclusion proofs are accepted and refused as published', async () => {
    const vectors = read<(Vector & { leafIdx: number; treeSize: number; root: string; leafHash: string })[]>(
      'transparency-dev-inclusion',
    );
    expect(vectors.length).toBeGreaterThan(90);
    for (const one of vectors) {
      const path = (one.proof ?? []).map(bytes);
      const got = await outcome(
        verifyInclusion(bytes(one.leafHash), one.leafIdx, one.treeSize, path, bytes(one.root)),
      );
      expect(got !== 'accepted', one.file).toBe(one.wantErr);
    }
  });

  test('consistency proofs are accepted and refused as published', async () => {
    const vectors = read<(Vector & { size1: number; size2: number; root1: string; root2: string })[]>(
      'transparency-dev-consistency',
    );
    expect(vectors.length).toBeGreaterThan(90);
    for (const one of vectors) {
      const path = (one.proof ?? []).map(bytes);
      const got = await outcome(
        verifyConsistency(one.size1, one.size2, path, bytes(one.root1), bytes(one.root2)),
      );
      expect(got !== 'accepted', one.file).toBe(one.wantErr);
    }
  });
});

describe('the reference tree of eight leaves (RFC 6962, 2.1)', () => {
  const tree = read<{ leafHashes: string[]; roots: string[] }>('ct-reference-8-leaves');
  const leaves = tree.leafHashes.map(unhex);
  test('every size has its published root', () => {
    for (const [i, root] of tree.roots.entries()) expect(hex(naiveRoot(leaves.slice(0, i + 1)))).toBe(root);
  });
  test('every leaf leads to every published root', async () => {
    for (const [i, root] of tree.roots.entries())
      for (let leaf = 0; leaf <= i; leaf++)
        expect(
          hex(
            await rootFromInclusion(
              leaves[leaf] as Uint8Array,
              leaf,
              i + 1,
              naiveInclusion(leaf, leaves.slice(0, i + 1)),
            ),
          ),
        ).toBe(root);
  });
});

const someLeaves = (count: number) =>
  Array.from({ length: count }, (_, i) => naiveLeaf(Buffer.from(`entry ${i}`)));
const hashOf = (place: Place, leaves: readonly Uint8Array[]) => {
  const width = 2 ** place.level;
  const part = leaves.slice(place.position * width, (place.position + 1) * width);
  expect(part).toHaveLength(width);
  return naiveRoot(part);
};
const fold = (part: Place[], leaves: readonly Uint8Array[]) =>
  foldHashes(part.map((place) => hashOf(place, leaves)));

const sizes = fc.integer({ min: 1, max: 130 });

describe('any tree, against the definition', () => {
  test('its root folds from complete subtrees', () => {
    fc.assert(
      fc.property(sizes, (size) => {
        const leaves = someLeaves(size);
        expect(hex(fold(placesOfRange(0, size), leaves))).toBe(hex(naiveRoot(leaves)));
      }),
    );
  });

  test('an inclusion path is the defined one, leads to the root, and to no other once a bit is turned', async () => {
    await fc.assert(
      fc.asyncProperty(sizes, fc.nat(), fc.nat(), async (size, at, bit) => {
        const leaves = someLeaves(size);
        const index = at % size;
        const leaf = leaves[index] as Uint8Array;
        const path = inclusionParts(index, size).map((part) => new Uint8Array(fold(part, leaves)));
        expect(path.map(hex)).toEqual(naiveInclusion(index, leaves).map(hex));
        const root = naiveRoot(leaves);
        const sides = sidesOfPath(index, size);
        const folded = path.reduce(
          (hash, sibling, i) =>
            new Uint8Array(sides[i] === 'left' ? nodeHashNow(sibling, hash) : nodeHashNow(hash, sibling)),
          leaf,
        );
        expect([hex(folded), sides.length]).toEqual([hex(root), path.length]);
        await verifyInclusion(leaf, index, size, path, root);
        if (size > 1) {
          const bad = path.map((hash) => Uint8Array.from(hash));
          const victim = bad[bit % bad.length] as Uint8Array;
          victim[bit % 32] = (victim[bit % 32] ?? 0) ^ (1 << (bit % 8));
          expect(await outcome(verifyInclusion(leaf, index, size, bad, root))).toBe('proof-root');
          expect(await outcome(verifyInclusion(leaf, index, size, path.slice(1), root))).not.toBe('accepted');
        }
        expect(await outcome(verifyInclusion(leaf, index, size, [...path, leaf], root))).toBe('proof-length');
        expect(await outcome(verifyInclusion(leaf, size, size, path, root))).toBe('proof-index');
      }),
    );
  });

  test('a consistency path is the defined one, and proves nothing about another tree', async () => {
    await fc.assert(
      fc.asyncProperty(sizes, fc.nat(), async (size, at) => {
        const leaves = someLeaves(size);
        const from = 1 + (at % size);
        const path = consistencyParts(from, size).map((part) => new Uint8Array(fold(part, leaves)));
        expect(path.map(hex)).toEqual(naiveConsistency(from, leaves).map(hex));
        const [fromRoot, root] = [naiveRoot(leaves.slice(0, from)), naiveRoot(leaves)];
        await verifyConsistency(from, size, path, fromRoot, root);
        const other = naiveLeaf(Buffer.from('another tree'));
        expect(await outcome(verifyConsistency(from, size, path, other, root))).toBe('proof-root');
        expect(await outcome(verifyConsistency(from, size, path, fromRoot, other))).toBe('proof-root');
        expect(await outcome(verifyConsistency(size + 1, size, path, fromRoot, root))).toBe('proof-size');
        expect(await outcome(verifyConsistency(0, size, path, fromRoot, root))).toBe('proof-size');
      }),
    );
  });
});

test('sizes beyond four thousand million are counted exactly', () => {
  const size = 2 ** 40 + 5;
  const parts = inclusionParts(2 ** 40 + 1, size);
  expect(parts.map((part) => part.map(({ level, position }) => `${level}:${position}`).join('+'))).toEqual([
    `0:${2 ** 40}`,
    `1:${2 ** 39 + 1}`,
    `0:${2 ** 40 + 4}`,
    '40:0',
  ]);
});

test('a hash that is not of 32 bytes is refused before anything is computed', async () => {
  const leaf = naiveLeaf(Buffer.from('a'));
  expect(await outcome(rootFromInclusion(leaf, 0, 2, [leaf.subarray(1)]))).toBe('proof-hash');
  expect(await outcome(rootFromInclusion(leaf.subarray(1), 0, 1, []))).toBe('proof-hash');
});
