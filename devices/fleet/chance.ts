import { seeded } from '../synth/noise';

/**
 * A stream of chance of its own for each purpose: what one device draws leaves the others as they were, so a fleet
 * is the same by seed however its calls interleave.
 */
export function chanceOf(seed: number, ...purpose: (string | number)[]): () => number {
  // FNV-1a, 32 bit (Fowler, Noll, Vo; constants from memory).
  let hash = 0x811c9dc5;
  for (const character of new TextEncoder().encode([seed, ...purpose].join('\u0000')))
    hash = Math.imul(hash ^ character, 0x01000193);
  return seeded(hash);
}
