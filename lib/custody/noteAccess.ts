import { and, desc, eq, gte } from 'drizzle-orm';
import { custodyEntry, custodySubject } from '@/db/schema';
import type { Services } from '@/lib/platform/services';
import { appendEntries } from './append';
import type { Actor, EntryKind, Subject } from './entry';

/** One look that lasts is one line: the same person and recording within this is not written again. */
const WITHIN_MS: Partial<Record<EntryKind, number>> = { 'looked-at': 15 * 60_000, heard: 10 * 60_000 };

/**
 * Write that a person looked at, heard or downloaded a recording. Called by the very route that hands out the bytes,
 * so that there is no way to them past the log.
 */
export async function noteAccess(
  services: Pick<Services, 'read' | 'write' | 'clock'>,
  kind: 'looked-at' | 'heard' | 'downloaded',
  actor: Actor,
  recording: { id: string; number: string },
  more: { subjects?: Subject[]; detail?: Record<string, unknown> } = {},
): Promise<void> {
  const now = services.clock.now();
  const within = WITHIN_MS[kind];
  if (within !== undefined) {
    const [lately] = await services.read
      .select({ sequence: custodyEntry.sequence })
      .from(custodySubject)
      .innerJoin(custodyEntry, eq(custodyEntry.sequence, custodySubject.sequence))
      .where(
        and(
          eq(custodySubject.subjectKind, 'recording'),
          eq(custodySubject.subjectId, recording.id),
          eq(custodyEntry.kind, kind),
          eq(custodyEntry.actorId, actor.id),
          gte(custodyEntry.at, now - within),
        ),
      )
      .orderBy(desc(custodySubject.sequence))
      .limit(1);
    if (lately) return;
  }
  await services.write((tx) =>
    appendEntries(tx, now, [
      {
        kind,
        actor,
        subjects: [{ kind: 'recording', id: recording.id }, ...(more.subjects ?? [])],
        detail: { number: recording.number, ...more.detail },
      },
    ]),
  );
}
