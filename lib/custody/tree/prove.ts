import type { Reader } from '@/db/client';
import type { Tx } from '@/db/write';
import { Refusal } from '@/lib/platform/errors';
import { hex } from '../pure/hash';
import { consistencyParts, inclusionParts, type Place, placesOfRange } from '../pure/shape';
import { foldHashes } from './hashes';
import { placeKey, readNodes } from './nodes';

/** As routes give it and evidence packages hold it: hashes in lower-case hex, leaf first. */
export interface InclusionProof {
  sequence: number;
  treeSize: number;
  leafHash: string;
  path: string[];
}

export interface ConsistencyProof {
  from: number;
  to: number;
  path: string[];
}

/** SQLite takes 32,766 values in one statement; a proof of 10 million entries asks for at most 60 places. */
const PLACES_AT_ONCE = 6_000;

async function readAll(from: Reader | Tx, places: readonly Place[]): Promise<Map<string, Uint8Array>> {
  const known = new Map<string, Uint8Array>();
  for (let at = 0; at < places.length; at += PLACES_AT_ONCE)
    for (const [key, hash] of await readNodes(from, places.slice(at, at + PLACES_AT_ONCE)))
      known.set(key, hash);
  return known;
}

/** @throws Refusal `not-found` where the log does not reach that far */
function foldPart(part: readonly Place[], known: Map<string, Uint8Array>): Uint8Array {
  return foldHashes(
    part.map((place) => {
      const hash = known.get(placeKey(place));
      if (!hash) throw new Refusal('not-found', 'The log does not reach that far.');
      return hash;
    }),
  );
}

/** Root of the tree of the first `size` entries (RFC 9162, 2.1.1), from its complete subtrees. */
export async function rootAt(from: Reader | Tx, size: number): Promise<Uint8Array> {
  const places = placesOfRange(0, size);
  return foldPart(places, await readAll(from, places));
}

/**
 * Inclusion proofs of some entries in the tree of the first `size` entries (RFC 9162, 2.1.3.1), in one query.
 *
 * @throws Refusal `not-found` where an entry is not in that tree, or the log does not reach that far
 */
export async function inclusionProofs(
  from: Reader | Tx,
  sequences: readonly number[],
  size: number,
): Promise<InclusionProof[]> {
  if (sequences.some((sequence) => sequence >= size))
    throw new Refusal('not-found', `An entry is not in a tree of ${size}.`);
  const plans = sequences.map((sequence) => ({
    sequence,
    leaf: { level: 0, position: sequence },
    parts: inclusionParts(sequence, size),
  }));
  const wanted = new Map<string, Place>();
  for (const { leaf, parts } of plans)
    for (const place of [leaf, ...parts.flat()]) wanted.set(placeKey(place), place);
  const known = await readAll(from, [...wanted.values()]);
  return plans.map(({ sequence, leaf, parts }) => ({
    sequence,
    treeSize: size,
    leafHash: hex(foldPart([leaf], known)),
    path: parts.map((part) => hex(foldPart(part, known))),
  }));
}

/**
 * Proof that the tree of `to` entries holds the tree of the first `from`, unchanged (RFC 9162, 2.1.4.1).
 *
 * @throws Refusal `not-found` where there is no such proof, or the log does not reach that far
 */
export async function consistencyProof(
  reader: Reader | Tx,
  from: number,
  to: number,
): Promise<ConsistencyProof> {
  if (from < 1 || from > to) throw new Refusal('not-found', `No tree of ${to} follows one of ${from}.`);
  const parts = consistencyParts(from, to);
  const known = await readAll(reader, [{ level: 0, position: to - 1 }, ...parts.flat()]);
  foldPart([{ level: 0, position: to - 1 }], known);
  return { from, to, path: parts.map((part) => hex(foldPart(part, known))) };
}
