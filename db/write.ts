import type { Client } from '@libsql/client';
import { drizzle, type LibSQLDatabase } from 'drizzle-orm/libsql';
import { setPragmas } from './pragmas';
import * as schema from './schema';

export type Tx = Parameters<Parameters<LibSQLDatabase<typeof schema>['transaction']>[0]>[0];

/**
 * Do `work` in one immediate transaction, alone. It commits when the promise resolves and leaves no trace when it
 * rejects. No network inside: everybody else waits. Never call it from inside `work`.
 */
export type Write = <T>(work: (tx: Tx) => Promise<T>) => Promise<T>;

/** The code that libSQL gave, wherever Drizzle wrapped it. */
export function databaseCode(error: unknown): string | undefined {
  let at: unknown = error;
  for (let depth = 0; depth < 5 && at instanceof Error; depth++) {
    const code =
      (at as { extendedCode?: unknown; code?: unknown }).extendedCode ?? (at as { code?: unknown }).code;
    if (typeof code === 'string' && code.startsWith('SQLITE')) return code;
    at = at.cause;
  }
  return undefined;
}

/** Whether a unique key was taken: said by an index, or by a trigger that guards one in its words. */
export function isUniqueViolation(error: unknown): boolean {
  const code = databaseCode(error) ?? '';
  if (/^SQLITE_CONSTRAINT(_UNIQUE|_PRIMARYKEY)?$/.test(code)) return true;
  return code === 'SQLITE_CONSTRAINT_TRIGGER' && /UNIQUE constraint failed/.test(wordsOf(error));
}

const wordsOf = (error: unknown): string =>
  error instanceof Error ? `${error.message} ${wordsOf(error.cause)}` : '';

const isBusy = (error: unknown): boolean => /^SQLITE_(BUSY|LOCKED)/.test(databaseCode(error) ?? '');

const BUSY_TRIES = 5;

export interface WriteQueue {
  write: Write;
  /** The writer client, alone for as long as `work` takes; each statement commits by itself. */
  alone<T>(work: (writer: Client) => Promise<T>): Promise<T>;
}

/**
 * The one write queue of a process.
 *
 * After SQLITE_BUSY the failed statement stays open on its connection, and what is written there afterwards
 * reports success without being committed: the connection is dropped at once and its pragmas set again.
 */
export function createWriteQueue(writer: Client, isFile: boolean): WriteQueue {
  const database = drizzle(writer, { schema });
  let last: Promise<unknown> = Promise.resolve();

  async function attempt<T>(work: () => Promise<T>): Promise<T> {
    for (let tries = 1; ; tries++) {
      try {
        return await work();
      } catch (error) {
        if (!isBusy(error)) throw error;
        writer.reconnect();
        if (isFile) await setPragmas(writer);
        if (tries >= BUSY_TRIES) throw error;
      }
    }
  }

  function inTurn<T>(work: () => Promise<T>): Promise<T> {
    const run = last.then(() => attempt(work));
    last = run.catch(() => undefined);
    return run;
  }

  return {
    write: (work) => inTurn(() => database.transaction(work, { behavior: 'immediate' })),
    alone: (work) => inTurn(() => work(writer)),
  };
}
