import { and, asc, inArray, isNull, lt } from 'drizzle-orm';
import { recording } from '@/db/schema';
import { Refusal } from '@/lib/platform/errors';
import { carryOn } from './completeRecording';
import type { IngestServices } from './types';

/** How long a clip may stand still before the sweep takes it up: longer than a device waits before it repeats. */
const STANDING_STILL_MS = 90_000;
const AT_ONCE = 50;
/** An awaited clip whose bytes never came stays awaited; it is looked for this long. */
const LOOKED_FOR_MS = 7 * 86_400_000;

/**
 * Carry on with clips whose device did not come back: bytes that were put but never completed, and passages that a
 * dying process left half way.
 *
 * @returns how many were brought to measured
 */
export async function sweepRecordings(services: IngestServices): Promise<number> {
  const now = services.clock.now();
  const rows = await services.read
    .select({
      id: recording.id,
      stage: recording.stage,
      slotKey: recording.slotKey,
      awaitedAt: recording.awaitedAt,
    })
    .from(recording)
    .where(
      and(
        inArray(recording.stage, ['awaited', 'received', 'sealed']),
        isNull(recording.stopped),
        lt(recording.awaitedAt, now - STANDING_STILL_MS),
      ),
    )
    .orderBy(asc(recording.awaitedAt))
    .limit(1000);
  let done = 0;
  for (const row of rows) {
    if (done >= AT_ONCE) break;
    if (
      row.stage === 'awaited' &&
      (row.awaitedAt < now - LOOKED_FOR_MS || (await services.storage.head(row.slotKey)) === null)
    )
      continue;
    try {
      await carryOn(services, row.id);
      done++;
    } catch (error) {
      if (!(error instanceof Refusal))
        services.log.error({ err: error, recordingId: row.id }, 'the sweep could not carry a clip on');
    }
  }
  return done;
}
