import { and, asc, eq, exists, inArray, isNull, lte, or, sql } from 'drizzle-orm';
import { credential, device, rotationMember, rotationRun } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { type NewEntry, SERVICE_ACTOR } from '@/lib/custody/entry';
import type { Services } from '@/lib/platform/services';

/** Devices told, or revoked, in one transaction: a wave of a thousand must not hold up a clip. */
const AT_ONCE = 100;

type Run = typeof rotationRun.$inferSelect;
type Needs = Pick<Services, 'read' | 'write' | 'clock'>;

const OPEN = ['waiting', 'asked'] as const;
const ofRun = (run: Run) => eq(rotationMember.runId, run.id);

/**
 * Carry every run a step further: note who is done, tell the next wave, act at the deadline, end what is over. Each
 * step is a transaction that decides by what stands in the database, so several processes may do this, and one that
 * dies leaves its work to the next.
 *
 * @returns whether something was done and more may be at once
 */
export async function advanceRuns(services: Needs): Promise<boolean> {
  const runs = await services.read
    .select({ id: rotationRun.id })
    .from(rotationRun)
    .where(inArray(rotationRun.state, ['running', 'paused']));
  let more = false;
  for (const { id } of runs) {
    const now = services.clock.now();
    more = (await services.write((tx) => advance(tx, id, now))) || more;
  }
  return more;
}

async function advance(tx: Tx, id: string, now: number): Promise<boolean> {
  const [run] = await tx.select().from(rotationRun).where(eq(rotationRun.id, id)).limit(1);
  if (!run || !['running', 'paused'].includes(run.state)) return false;
  await noteProgress(tx, run, now);
  if (run.deadlineAt <= now) {
    if (await actAtDeadline(tx, run, now)) return true;
  } else if (run.state === 'running' && run.nextWaveAt <= now) {
    if (await tellNext(tx, run, now)) return true;
  }
  await endWhenOver(tx, run, now);
  return false;
}

/** Whose successor is in use is done; whose credential ended otherwise is left out. */
async function noteProgress(tx: Tx, run: Run, now: number): Promise<void> {
  const row = (condition: ReturnType<typeof and>) =>
    exists(
      tx
        .select({ one: sql`1` })
        .from(credential)
        .where(and(eq(credential.id, rotationMember.credentialId), condition)),
    );
  const open = and(ofRun(run), inArray(rotationMember.state, [...OPEN]));
  await tx
    .update(rotationMember)
    .set({ state: 'done', endedAt: now })
    .where(and(open, row(eq(credential.state, 'retired'))));
  await tx
    .update(rotationMember)
    .set({ state: 'left-out', endedAt: now })
    .where(and(open, row(or(eq(credential.state, 'revoked'), lte(credential.expiresAt, now)))));
}

/** @returns whether the wave goes on */
async function tellNext(tx: Tx, run: Run, now: number): Promise<boolean> {
  // What of this wave was told already: a wave that a dying process began is finished, not begun again.
  const [told] = await tx
    .select({ count: sql<number>`count(*)` })
    .from(rotationMember)
    .where(and(ofRun(run), sql`${rotationMember.askedAt} >= ${run.nextWaveAt}`));
  const left = Math.min(AT_ONCE, run.waveSize - (told?.count ?? 0));
  const next = await tx
    .select({ credentialId: rotationMember.credentialId, deviceId: rotationMember.deviceId })
    .from(rotationMember)
    .where(and(ofRun(run), eq(rotationMember.state, 'waiting')))
    .orderBy(asc(rotationMember.credentialId))
    .limit(Math.max(0, left));
  const ids = next.map((member) => member.credentialId);
  if (ids.length > 0) {
    await tx
      .update(credential)
      .set({ renewalAskedAt: now, version: sql`${credential.version} + 1` })
      .where(and(inArray(credential.id, ids), isNull(credential.successorId)));
    await tx
      .update(rotationMember)
      .set({ state: 'asked', askedAt: now })
      .where(and(ofRun(run), inArray(rotationMember.credentialId, ids)));
    await appendEntries(
      tx,
      now,
      next.map(
        (member): NewEntry => ({
          kind: 'credential-renewal-asked',
          actor: SERVICE_ACTOR,
          subjects: [
            { kind: 'credential', id: member.credentialId },
            { kind: 'device', id: member.deviceId },
            { kind: 'rotation', id: run.id },
          ],
          detail: { run: run.label },
        }),
      ),
    );
  }
  if (ids.length === left && left === AT_ONCE) return true;
  await tx
    .update(rotationRun)
    .set({ nextWaveAt: Math.max(now + 1, run.nextWaveAt + run.wavePauseMs) })
    .where(eq(rotationRun.id, run.id));
  return false;
}

/** @returns whether there are more to act on */
async function actAtDeadline(tx: Tx, run: Run, now: number): Promise<boolean> {
  const late = await tx
    .select({
      credentialId: rotationMember.credentialId,
      deviceId: rotationMember.deviceId,
      familyId: credential.familyId,
    })
    .from(rotationMember)
    .innerJoin(credential, eq(credential.id, rotationMember.credentialId))
    .where(and(ofRun(run), inArray(rotationMember.state, [...OPEN])))
    .limit(AT_ONCE);
  if (late.length === 0) return false;
  await tx
    .update(rotationMember)
    .set({ state: 'missed', endedAt: now })
    .where(
      and(
        ofRun(run),
        inArray(
          rotationMember.credentialId,
          late.map((member) => member.credentialId),
        ),
      ),
    );
  if (run.atDeadline === 'revoke') await revokeLate(tx, run, late, now);
  return late.length === AT_ONCE;
}

async function revokeLate(
  tx: Tx,
  run: Run,
  late: { deviceId: string; familyId: string }[],
  now: number,
): Promise<void> {
  const why = `missed the deadline of ${run.label}`;
  const ended = await tx
    .update(credential)
    .set({ state: 'revoked', revokedAt: now, endReason: why })
    .where(
      and(
        inArray(
          credential.familyId,
          late.map((member) => member.familyId),
        ),
        inArray(credential.state, ['issued', 'in-use', 'superseded']),
      ),
    )
    .returning({ id: credential.id, label: credential.label, deviceId: credential.deviceId });
  await appendEntries(
    tx,
    now,
    ended.map(
      (row): NewEntry => ({
        kind: 'credential-revoked',
        actor: SERVICE_ACTOR,
        subjects: [
          { kind: 'credential', id: row.id },
          { kind: 'device', id: row.deviceId },
          { kind: 'rotation', id: run.id },
        ],
        detail: { label: row.label, why },
      }),
    ),
  );
}

async function endWhenOver(tx: Tx, run: Run, now: number): Promise<void> {
  const counts = await tx
    .select({ state: rotationMember.state, count: sql<number>`count(*)` })
    .from(rotationMember)
    .innerJoin(device, eq(device.id, rotationMember.deviceId))
    .where(ofRun(run))
    .groupBy(rotationMember.state);
  if (counts.some(({ state }) => state === 'waiting' || state === 'asked')) return;
  await tx
    .update(rotationRun)
    .set({ state: 'ended', endedAt: now, version: run.version + 1 })
    .where(eq(rotationRun.id, run.id));
  await appendEntries(tx, now, [
    {
      kind: 'rotation-ended',
      actor: SERVICE_ACTOR,
      subjects: [{ kind: 'rotation', id: run.id }],
      detail: {
        label: run.label,
        ...Object.fromEntries(counts.map(({ state, count }) => [state, count])),
      },
    },
  ]);
}
