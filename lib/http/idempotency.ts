import { createHash } from 'node:crypto';
import { eq } from 'drizzle-orm';
import { idempotencyKey } from '@/db/schema';
import { isUniqueViolation, type Tx } from '@/db/write';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';

/**
 * Repeats of one write (the header field Idempotency-Key). The answer is stored by the very transaction that made the
 * change, so there is no moment in which one exists without the other.
 */
export interface Idempotency {
  /**
   * Do a write once. `work` gets a function that it calls inside its transaction with the answer it will give.
   */
  once<T>(work: (remember: (tx: Tx, answer: T) => Promise<void>) => Promise<T>): Promise<T>;
  /** Whether the answer was one given before. */
  replayed(): boolean;
}

const KEY = /^[\w.:-]{8,128}$/;

export function idempotencyOf(
  services: Pick<Services, 'read' | 'clock'>,
  request: Request,
  actorId: string,
  routeKey: string,
  body: unknown,
  params: Record<string, string>,
): Idempotency {
  const header = request.headers.get('idempotency-key');
  if (header === null) return { once: (work) => work(async () => undefined), replayed: () => false };
  if (!KEY.test(header))
    throw new Refusal('body-invalid', 'Idempotency-Key takes 8 to 128 letters, digits and . : _ -', {
      errors: [{ path: 'idempotency-key', message: 'malformed' }],
    });
  const key = `${actorId} ${routeKey} ${header}`;
  const requestHash = createHash('sha256')
    .update(JSON.stringify([params, body ?? null]))
    .digest('hex');

  let replayed = false;
  async function stored<T>(): Promise<{ answer: T } | null> {
    const [row] = await services.read
      .select()
      .from(idempotencyKey)
      .where(eq(idempotencyKey.key, key))
      .limit(1);
    if (!row) return null;
    if (row.requestHash !== requestHash) throw new Refusal('idempotency-conflict');
    replayed = true;
    return { answer: JSON.parse(row.body) as T };
  }

  return {
    replayed: () => replayed,
    async once<T>(work: (remember: (tx: Tx, answer: T) => Promise<void>) => Promise<T>): Promise<T> {
      const before = await stored<T>();
      if (before) return before.answer;
      try {
        return await work(async (tx, answer) => {
          await tx.insert(idempotencyKey).values({
            key,
            requestHash,
            status: 200,
            body: JSON.stringify(answer ?? null),
            createdAt: services.clock.now(),
          });
        });
      } catch (error) {
        // Two equal requests at once: the other one did it, and ours was rolled back.
        const done = isUniqueViolation(error) || error instanceof Refusal ? await stored<T>() : null;
        if (done) return done.answer;
        throw error;
      }
    },
  };
}
