'use client';

import { useCallback, useEffect, useRef, useState } from 'react';
import {
  CHECK_IDS,
  type Check,
  type CheckedThread,
  type CheckId,
  checkOriginal,
  checkThread,
} from '@/lib/custody/pure/checkThread';
import { ledgerSources } from './verifySources';

type Checks = Record<CheckId, Check>;

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
  const [held, setHeld] = useState<string>();
  const turn = useRef(0);
  // Drawn anew by every live event: only other entries are another thread.
  const what = thread.entries.map(({ leafHash }) => leafHash).join();
  const latest = useRef(thread);
  latest.current = thread;
  const run = useCallback(
    async (withOriginal: boolean, against?: string) => {
      const mine = ++turn.current;
      const report = (check: Check) => {
        if (mine === turn.current) setChecks((before) => ({ ...before, [check.id]: check }));
      };
      const sources = ledgerSources(mayOpen ? number : null);
      await checkThread(latest.current, sources, report, against);
      if (withOriginal && number !== null) await checkOriginal(latest.current, sources, report);
    },
    [number, mayOpen],
  );
  // biome-ignore lint/correctness/useExhaustiveDependencies: `what` stands for the entries
  useEffect(() => {
    void run(false, held);
  }, [run, what, held]);
  return { checks, held, setHeld, verify: () => run(true, held) };
}
