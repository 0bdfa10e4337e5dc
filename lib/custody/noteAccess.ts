import { and, desc, eq, gte } from 'drizzle-orm';
import type { Reader } from '@/db/client';
import { custodyEntry, custodySubject } from '@/db/schema';
import type { Tx } from '@/db/write';
import type { Services } from '@/lib/platform/services';
import { appendEntries } from './append';
import type { Actor, EntryKind, Subject } from './entry';

export type Access = 'looked-at' | 'heard' | 'downloaded';

/** One look that lasts is one line: the same again within this is not written again. Each download is a line. */
const WITHIN_MS: Partial<Record<EntryKind, number>> = { 'looked-at': 15 * 60_000, heard: 10 * 60_000 };

export interface AccessDetail {
  subjects?: Subject[];
  /** What tells one act from another, such as the band it was heard through: other words are another line. */
  detail?: Record<string, unknown>;
  /** What stands in the entry but tells no act from another, such as how long it lasted. */
  facts?: Record<string, unknown>;
}

/**
 * Write that a person looked at, heard or downloaded a recording. Called by the very route that hands out the bytes,
 * so that there is no way to them past the log.
 *
 * @returns whether an entry was written
 */
export async function noteAccess(
  services: Pick<Services, 'read' | 'write' | 'clock'>,
  kind: Access,
  actor: Actor,
  recording: { id: string; number: string },
  more: AccessDetail = {},
): Promise<boolean> {
  const now = services.clock.now();
  const detail = { number: recording.number, ...more.detail };
  const within = WITHIN_MS[kind];
  const notedIn = (from: Reader | Tx) =>
    within === undefined ? false : isNoted(from, { kind, actor, detail, recording, sinceMs: now - within });
  if (await notedIn(services.read)) return false;
  return await services.write(async (tx) => {
    // Asked again: a page asks for its pictures at once, and one look is one line.
    if (await notedIn(tx)) return false;
    await appendEntries(tx, now, [
      {
        kind,
        actor,
        subjects: [{ kind: 'recording', id: recording.id }, ...(more.subjects ?? [])],
        detail: { ...detail, ...more.facts },
      },
    ]);
    return true;
  });
}

interface Act {
  kind: Access;
  actor: Actor;
  detail: Record<string, unknown>;
  recording: { id: string };
  sinceMs: number;
}

async function isNoted(from: Reader | Tx, act: Act): Promise<boolean> {
  const rows = await from
    .select({ canonical: custodyEntry.canonical })
    .from(custodySubject)
    .innerJoin(custodyEntry, eq(custodyEntry.sequence, custodySubject.sequence))
    .where(
      and(
        eq(custodySubject.subjectKind, 'recording'),
        eq(custodySubject.subjectId, act.recording.id),
        eq(custodyEntry.kind, act.kind),
        eq(custodyEntry.actorId, act.actor.id),
        gte(custodyEntry.at, act.sinceMs),
      ),
    )
    .orderBy(desc(custodySubject.sequence))
    .limit(200);
  const wanted = Object.entries(act.detail);
  return rows.some(({ canonical }) => {
    const { detail = {} } = JSON.parse(canonical) as { detail?: Record<string, unknown> };
    return wanted.every(([name, value]) => detail[name] === value);
  });
}
