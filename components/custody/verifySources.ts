import { getJson, ProblemError } from '@/components/shell/useData';
import type { HeadsAnswer, Sources } from '@/lib/custody/pure/checkThread';

/** Published verifier key strings, from the address that anybody reads. */
export async function publishedKeys(): Promise<string[]> {
  const answer = await fetch('/.well-known/custody-keys.txt', { cache: 'no-store' });
  if (!answer.ok) throw new Error(`The published keys could not be fetched (${answer.status}).`);
  return (await answer.text()).split('\n').filter((line) => line.trim() !== '');
}

export const consistencyPath = async (from: number, to: number): Promise<string[]> =>
  (await getJson<{ path: string[] }>(`/api/ledger/proofs/consistency?from=${from}&to=${to}`)).path;

async function bytesOf(number: string): Promise<Uint8Array> {
  const answer = await fetch(`/api/ledger/recordings/${encodeURIComponent(number)}/original`);
  if (!answer.ok) throw new Error(`The original could not be fetched (${answer.status}).`);
  return new Uint8Array(await answer.arrayBuffer());
}

/** Evidence over the ledger's routes. @param number of the recording whose original this person may open */
export const ledgerSources = (number: string | null): Sources => ({
  heads: () => getJson<HeadsAnswer>('/api/ledger/heads?limit=200'),
  keys: publishedKeys,
  inclusion: async (sequences, size) =>
    (
      await getJson<{ proofs: { sequence: number; path: string[] }[] }>(
        `/api/ledger/proofs/inclusion?sequence=${sequences.join(',')}&size=${size}`,
      )
    ).proofs,
  consistency: consistencyPath,
  async locked(size) {
    try {
      return (await getJson<{ note: string }>(`/api/ledger/heads/${size}/locked`)).note;
    } catch (error) {
      if (error instanceof ProblemError && error.status === 404) return null;
      throw error;
    }
  },
  original: number === null ? null : () => bytesOf(number),
});
