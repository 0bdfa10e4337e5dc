'use client';

import { useCallback, useRef, useState } from 'react';
import { ProblemError, sendJson } from '@/components/shell/useData';

/**
 * One act of a form: sends it once, keeps its key for a repeat, and says what came of it. Double presses and repeats
 * after a lost answer change nothing twice.
 */
export function useAct<T = unknown>(url: string) {
  const [busy, setBusy] = useState(false);
  const [failure, setFailure] = useState<ProblemError | null>(null);
  const key = useRef<string | null>(null);
  const act = useCallback(
    async (body: unknown): Promise<T | null> => {
      setBusy(true);
      setFailure(null);
      key.current ??= crypto.randomUUID();
      try {
        const answer = await sendJson<T>(url, body, key.current);
        key.current = null;
        return answer;
      } catch (error) {
        const problem =
          error instanceof ProblemError
            ? error
            : new ProblemError(
                0,
                'no-answer',
                'No answer',
                'The server did not answer. Nothing may have been changed; try again.',
                {},
              );
        // A refusal ends this act; without an answer the same key is sent again.
        if (problem.status > 0 && problem.status < 500) key.current = null;
        setFailure(problem);
        return null;
      } finally {
        setBusy(false);
      }
    },
    [url],
  );
  return { act, busy, failure };
}

/** Errors of single fields out of a problem's `errors` member. */
export function fieldErrors(failure: ProblemError | null): Record<string, string> {
  const errors = failure?.members.errors;
  if (!Array.isArray(errors)) return {};
  return Object.fromEntries(
    errors.flatMap((error: unknown) => {
      const { path, message } = (error ?? {}) as { path?: unknown; message?: unknown };
      return typeof path === 'string' && typeof message === 'string' ? [[path, message]] : [];
    }),
  );
}
