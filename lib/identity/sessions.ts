import { and, desc, eq, ne, type SQL } from 'drizzle-orm';
import { z } from 'zod';
import { session } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import type { Authorized } from '@/lib/platform/authority';
import { personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';

export interface SessionLine {
  id: string;
  startedAt: number;
  /** Within five minutes. */
  lastUsedAt: number;
  endsAt: number;
  address: string | null;
  program: string | null;
}

/** Sessions of one person that have not ended, the latest first. */
export async function sessionsOf(
  services: Pick<Services, 'read' | 'clock'>,
  personId: string,
): Promise<SessionLine[]> {
  const rows = await services.read
    .select()
    .from(session)
    .where(eq(session.userId, personId))
    .orderBy(desc(session.updatedAt))
    .limit(100);
  const now = services.clock.now();
  return rows
    .filter((row) => row.expiresAt.getTime() > now)
    .map((row) => ({
      id: row.id,
      startedAt: row.createdAt.getTime(),
      lastUsedAt: row.updatedAt.getTime(),
      endsAt: row.expiresAt.getTime(),
      address: row.ipAddress || null,
      program: row.userAgent || null,
    }));
}

/** End a person's sessions in the caller's transaction; from its commit on no request finds them. @returns how many */
export async function deleteSessions(tx: Tx, personId: string, which?: SQL): Promise<number> {
  const gone = await tx
    .delete(session)
    .where(and(eq(session.userId, personId), which))
    .returning({ id: session.id });
  return gone.length;
}

export const SessionsToEnd = z.union([
  z.strictObject({ id: z.string().min(1).max(100) }),
  z.strictObject({ others: z.literal(true) }),
]);

/**
 * End one of one's own sessions, or all but the one this request came in by.
 *
 * @throws Refusal `not-found` when it is not one's own or has ended
 */
export async function endOwnSessions(
  services: Pick<Services, 'write' | 'clock'>,
  by: Authorized<'self'>,
  which: z.infer<typeof SessionsToEnd>,
): Promise<{ ended: number }> {
  return await services.write(async (tx) => {
    const ended = await deleteSessions(
      tx,
      by.id,
      'id' in which ? eq(session.id, which.id) : ne(session.id, by.sessionId),
    );
    if ('id' in which && ended === 0) throw new Refusal('not-found', 'This session has ended already.');
    if (ended > 0) {
      await appendEntries(tx, services.clock.now(), [
        {
          kind: 'sessions-ended',
          actor: personActor(by, 'self'),
          subjects: [{ kind: 'person', id: by.id }],
          detail: { count: ended },
        },
      ]);
    }
    return { ended };
  });
}
