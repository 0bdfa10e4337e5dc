import { and, asc, eq, isNull, lte, ne, or } from 'drizzle-orm';
import { outbox } from '@/db/schema';
import type { Services } from './services';

const LEASE_MS = 60_000;
const MOST_TRIES = 12;
const EVERY_MS = 1_000;

type Needs = Pick<Services, 'read' | 'write' | 'clock' | 'log'>;
/** Does one piece of work. It may be called twice for the same one: a process can die after doing it. */
export type Handler = (payload: Record<string, unknown>) => Promise<void>;

/** One kind of work alone, or all but one: what is slow has a line of its own. */
export type Line = { only: string } | { except: string };

const inLine = (line: Line | undefined) =>
  line === undefined ? undefined : 'only' in line ? eq(outbox.kind, line.only) : ne(outbox.kind, line.except);

/** Minutes grow from one to an hour, so that a mail server that is down for a day is survived. */
const backoffMs = (tries: number): number => Math.min(3_600_000, 60_000 * 2 ** Math.max(0, tries - 1));

/**
 * Do the outbox's due work once. Each piece is leased first, so several processes may run this; what fails is tried
 * again later, and after twelve tries it is set aside for a person to look at.
 *
 * @returns how many pieces were done
 */
export async function runOutboxOnce(
  services: Needs,
  handlers: Record<string, Handler>,
  line?: Line,
): Promise<number> {
  let done = 0;
  for (;;) {
    const now = services.clock.now();
    const piece = await services.write(async (tx) => {
      const [due] = await tx
        .select()
        .from(outbox)
        .where(
          and(
            isNull(outbox.doneAt),
            isNull(outbox.deadAt),
            lte(outbox.dueAt, now),
            inLine(line),
            or(isNull(outbox.leasedUntil), lte(outbox.leasedUntil, now)),
          ),
        )
        .orderBy(asc(outbox.dueAt))
        .limit(1);
      if (due)
        await tx
          .update(outbox)
          .set({ leasedUntil: now + LEASE_MS, tries: due.tries + 1 })
          .where(eq(outbox.id, due.id));
      return due;
    });
    if (!piece) return done;
    try {
      const handler = handlers[piece.kind];
      if (!handler) throw new Error(`nobody does ${piece.kind}`);
      await handler(piece.payload);
      await services.write(async (tx) => {
        await tx
          .update(outbox)
          // What was sent may hold a token that only its receiver should have: nothing of it is kept.
          .set({ doneAt: services.clock.now(), leasedUntil: null, lastError: null, payload: {} })
          .where(eq(outbox.id, piece.id));
      });
      done++;
    } catch (error) {
      const tries = piece.tries + 1;
      services.log.warn({ err: error, kind: piece.kind, tries }, 'outbox work failed');
      await services.write(async (tx) => {
        await tx
          .update(outbox)
          .set({
            leasedUntil: null,
            lastError: error instanceof Error ? error.name : 'error',
            dueAt: services.clock.now() + backoffMs(tries),
            deadAt: tries >= MOST_TRIES ? services.clock.now() : null,
          })
          .where(eq(outbox.id, piece.id));
      });
    }
  }
}

/** Keep the outbox empty from now on. @returns how to stop */
export function startOutbox(services: Needs, handlers: Record<string, Handler>, line?: Line): () => void {
  let running = false;
  const timer = setInterval(async () => {
    if (running) return;
    running = true;
    try {
      const [due] = await services.read
        .select({ id: outbox.id })
        .from(outbox)
        .where(
          and(
            isNull(outbox.doneAt),
            isNull(outbox.deadAt),
            lte(outbox.dueAt, services.clock.now()),
            inLine(line),
          ),
        )
        .limit(1);
      if (due) await runOutboxOnce(services, handlers, line);
    } catch (error) {
      services.log.error({ err: error }, 'the outbox could not be worked');
    } finally {
      running = false;
    }
  }, EVERY_MS);
  timer.unref();
  return () => clearInterval(timer);
}
