'use client';

import { useEffect, useState } from 'react';

export interface SearchResult {
  kind: 'device' | 'recording' | 'patient' | 'encounter' | 'room';
  label: string;
  detail: string;
  href: string;
}
export type SearchState =
  | { state: 'idle' }
  | { state: 'looking'; results: readonly SearchResult[] }
  | { state: 'found'; results: readonly SearchResult[] }
  | { state: 'failed' };

/** Asks `GET /api/search?q=` a moment after the last key; an older answer never replaces a newer one. */
export function useSearch(query: string, attempt: number): SearchState {
  const [found, setFound] = useState<SearchState>({ state: 'idle' });
  const wanted = query.trim();
  // biome-ignore lint/correctness/useExhaustiveDependencies: another attempt asks again
  useEffect(() => {
    if (wanted.length < 2) {
      setFound({ state: 'idle' });
      return;
    }
    const stop = new AbortController();
    setFound((before) => ({ state: 'looking', results: 'results' in before ? before.results : [] }));
    const timer = setTimeout(async () => {
      try {
        const answer = await fetch(`/api/search?q=${encodeURIComponent(wanted)}`, { signal: stop.signal });
        if (!answer.ok) throw new Error(`search answered ${answer.status}`);
        const { results } = (await answer.json()) as { results: SearchResult[] };
        setFound({ state: 'found', results });
      } catch {
        if (!stop.signal.aborted) setFound({ state: 'failed' });
      }
    }, 160);
    return () => {
      clearTimeout(timer);
      stop.abort();
    };
  }, [wanted, attempt]);
  return found;
}
