'use client';

import { useCallback, useEffect, useRef, useState } from 'react';
import {
  CHECK_IDS,
  type Check,
  type CheckedThread,
  type CheckId,
  checkOriginal,
  checkThread,
  type Sources,
} from '@/lib/custody/pure/checkThread';
import { ledgerSources } from './verifySources';

type Checks = Record<CheckId, Check>;

/** What the checks went by, to be shown: the newest head as it is signed, and the path of one entry. */
export interface Seen {
  note: string | null;
  path: { sequence: number; size: number; leaf: string; path: readonly string[] } | null;
}

const waiting = (): Checks =>
  Object.fromEntries(
    CHECK_IDS.map((id) => [id, { id, state: 'waiting', value: '', detail: '' }]),
  ) as unknown as Checks;

/**
 * The checks of one thread. Those of the log run at once; the original is fetched when the reader asks, because that
 * is written in the thread itself.
 */
export function useThreadChecks(number: string | null, mayOpen: boolean, thread: CheckedThread) {
  const [checks, setChecks] = useState(waiting);
  const [seen, setSeen] = useState<Seen>({ note: null, path: null });
  const [held, setHeld] = useState<string>();
  // Drawn anew by every live event: only other entries are another thread.
  const what = thread.entries.map(({ leafHash }) => leafHash).join();
  const latest = useRef(thread);
  latest.current = thread;
  const logTurn = useRef(0);
  const originalTurn = useRef(0);

  const checkLog = useCallback(
    async (against?: string) => {
      const report = reporter(logTurn, setChecks);
      const sources = watched(ledgerSources(mayOpen ? number : null), latest.current, setSeen);
      await checkThread(latest.current, sources, report, against);
    },
    [number, mayOpen],
  );
  // Of its own: fetching the original is an entry, the entry draws the page anew, and that checks the log once more.
  const checkBytes = useCallback(async () => {
    if (number === null) return;
    const report = reporter(originalTurn, setChecks);
    await checkOriginal(latest.current, ledgerSources(mayOpen ? number : null), report);
  }, [number, mayOpen]);

  // biome-ignore lint/correctness/useExhaustiveDependencies: `what` stands for the entries
  useEffect(() => {
    void checkLog(held);
  }, [checkLog, what, held]);
  return {
    checks,
    seen,
    held,
    setHeld,
    verify: async () => {
      await checkLog(held);
      await checkBytes();
    },
  };
}

/** Tells of checks until the same ones are begun again. */
function reporter(turn: { current: number }, tell: (change: (before: Checks) => Checks) => void) {
  const mine = ++turn.current;
  return (check: Check) => {
    if (mine === turn.current) tell((before) => ({ ...before, [check.id]: check }));
  };
}

/** Sources that show what they gave. */
function watched(
  sources: Sources,
  thread: CheckedThread,
  show: (change: (before: Seen) => Seen) => void,
): Sources {
  return {
    ...sources,
    async heads() {
      const answer = await sources.heads();
      show((before) => ({ ...before, note: answer.rows[0]?.note ?? null }));
      return answer;
    },
    async inclusion(sequences, size) {
      const proofs = await sources.inclusion(sequences, size);
      const proof = proofs.at(-1);
      const leaf = thread.entries.find(({ sequence }) => sequence === proof?.sequence)?.leafHash;
      show((before) => ({ ...before, path: proof && leaf ? { ...proof, size, leaf } : null }));
      return proofs;
    },
  };
}
