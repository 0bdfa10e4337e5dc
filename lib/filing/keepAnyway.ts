import { and, eq, isNull } from 'drizzle-orm';
import { z } from 'zod';
import { filing, recording } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';

export const Keep = z.strictObject({ reason: z.string().trim().min(5).max(500) });

/**
 * Keep a clip that should be recorded again, with a reason: a crying child may not allow a second try. The verdict
 * stays what it is.
 *
 * @param number the recording's number
 * @throws Refusal `not-found`, `not-possible`
 */
export async function keepAnyway(
  services: Pick<Services, 'write' | 'clock'>,
  by: Authorized<'recording.keep'>,
  number: string,
  reason: string,
  remember?: (tx: Tx, answer: { recording: string }) => Promise<void>,
): Promise<{ recording: string }> {
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const [clip] = await tx
      .select()
      .from(recording)
      .where(eq(recording.number, number.toUpperCase()))
      .limit(1);
    if (!clip) throw new Refusal('not-found');
    if (clip.verdict !== 'repeat')
      throw new Refusal('not-possible', `${clip.number} need not be recorded again.`);
    if (clip.keptAt !== null) throw new Refusal('not-possible', `${clip.number} is kept already.`);
    const [filed] = await tx
      .select({ encounterId: filing.encounterId, patientId: filing.patientId })
      .from(filing)
      .where(and(eq(filing.recordingId, clip.id), isNull(filing.supersededAt)))
      .limit(1);
    await tx
      .update(recording)
      .set({ keptReason: reason, keptBy: by.id, keptAt: now, version: clip.version + 1 })
      .where(eq(recording.id, clip.id));
    await appendEntries(tx, now, [
      {
        kind: 'kept-anyway',
        actor: personActor(by, 'recording.keep'),
        subjects: [
          { kind: 'recording', id: clip.id },
          { kind: 'device', id: clip.deviceId },
          ...(filed
            ? [
                { kind: 'encounter' as const, id: filed.encounterId },
                { kind: 'patient' as const, id: filed.patientId },
              ]
            : []),
        ],
        detail: { number: clip.number, reason },
      },
    ]);
    const answer = { recording: clip.number };
    await remember?.(tx, answer);
    return answer;
  });
}
