import { hashOfHex } from './checkThread';
import { verifyHead } from './head';
import { parseVerifier } from './note';
import { verifyConsistency } from './proofs';

/**
 * That of two heads of a log the later one's tree holds the earlier one's, both signed by published keys.
 *
 * @param consistency hashes of the proof in hex, asked for when both signatures hold and the sizes differ
 * @returns sizes, the smaller first
 * @throws CustodyError what does not hold; whatever `consistency` throws
 */
export async function compareHeads(
  notes: readonly [string, string],
  origin: string,
  keys: readonly string[],
  consistency: (from: number, to: number) => Promise<string[]>,
): Promise<{ from: number; to: number; hashes: number }> {
  const trusted = await Promise.all(keys.map((line) => parseVerifier(line)));
  const heads = [
    await verifyHead(notes[0], origin, trusted),
    await verifyHead(notes[1], origin, trusted),
  ] as const;
  const [older, newer] = heads[0].size <= heads[1].size ? heads : [heads[1], heads[0]];
  const path = older.size === newer.size ? [] : await consistency(older.size, newer.size);
  await verifyConsistency(older.size, newer.size, path.map(hashOfHex), older.root, newer.root);
  return { from: older.size, to: newer.size, hashes: path.length };
}
