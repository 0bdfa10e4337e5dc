import { hex, leafHash } from './hash';

export interface LeafCheck {
  sequence: number;
  expected: string;
  computed: string;
  right: boolean;
}

/**
 * Hash each entry's canonical text and hold it against the leaf hash that stands beside it (RFC 6962, 2.1). Runs in
 * the reader's browser. It shows that text and hash belong together; that they are the ones of the log is what a
 * signed head proves.
 */
export async function checkLeaves(
  entries: readonly { sequence: number; canonical: string; leafHash: string }[],
): Promise<LeafCheck[]> {
  const encoder = new TextEncoder();
  return await Promise.all(
    entries.map(async ({ sequence, canonical, leafHash: expected }) => {
      const computed = hex(await leafHash(encoder.encode(canonical)));
      return { sequence, expected, computed, right: computed === expected };
    }),
  );
}
