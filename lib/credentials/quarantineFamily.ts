import { and, desc, eq, gt, inArray } from 'drizzle-orm';
import { credential, custodyEntry, custodySubject, outbox } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { type NewEntry, SERVICE_ACTOR } from '@/lib/custody/entry';
import { type DeviceRow, deviceActor } from '@/lib/keys/device';
import type { CredentialRow } from '@/lib/keys/token';
import { newId } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';

/** A call that was under way when the successor was first used is late, not stolen. */
const LATE_MS = 120_000;
/** Who knocks on and on writes one line an hour. */
const ONE_ENTRY_EVERY_MS = 3_600_000;

type Needs = Pick<Services, 'read' | 'write' | 'clock' | 'log'>;

/**
 * An ended credential was used, with a right proof where it is bound: somebody has a copy of it or of the device's key,
 * or the device woke from an old state. Where it was superseded and retired, its whole family is quarantined: whoever
 * holds the copy could otherwise have renewed it (RFC 9700, 4.14.2, for refresh tokens). The IT administrators are told
 * by mail; the device enrols again.
 *
 * @param why the standing that was found: `retired`, `revoked` or `overlap ended`
 */
export async function noteMisuse(
  services: Needs,
  row: { credential: CredentialRow; device: DeviceRow },
  why: string,
): Promise<void> {
  if (why === 'expired') return;
  const now = services.clock.now();
  await services.write(async (tx) => {
    if (await isLate(tx, row.credential, now)) return;
    if (await wasTold(tx, row.credential.id, now)) return;
    services.log.warn({ credentialId: row.credential.id, why }, 'an ended credential was used');
    const entries: NewEntry[] = [
      {
        kind: 'credential-misused',
        actor: deviceActor(row.device),
        subjects: [
          { kind: 'device', id: row.device.id },
          { kind: 'credential', id: row.credential.id },
        ],
        detail: { label: row.credential.label, why },
      },
    ];
    if (why !== 'revoked') entries.push(...(await quarantine(tx, row, now)));
    await appendEntries(tx, now, entries);
    if (why === 'revoked') return;
    await tx.insert(outbox).values({
      id: newId(),
      kind: 'credential-alarm',
      payload: {
        noticeId: newId(),
        deviceId: row.device.id,
        assetTag: row.device.assetTag,
        label: row.credential.label,
      },
      createdAt: now,
      dueAt: now,
    });
  });
}

async function isLate(tx: Tx, ended: CredentialRow, now: number): Promise<boolean> {
  if (ended.successorId === null) return false;
  const [successor] = await tx
    .select({ firstUsedAt: credential.firstUsedAt })
    .from(credential)
    .where(eq(credential.id, ended.successorId))
    .limit(1);
  return successor?.firstUsedAt != null && now - successor.firstUsedAt < LATE_MS;
}

async function wasTold(tx: Tx, credentialId: string, now: number): Promise<boolean> {
  const [last] = await tx
    .select({ at: custodyEntry.at })
    .from(custodySubject)
    .innerJoin(custodyEntry, eq(custodyEntry.sequence, custodySubject.sequence))
    .where(
      and(
        eq(custodySubject.subjectKind, 'credential'),
        eq(custodySubject.subjectId, credentialId),
        eq(custodyEntry.kind, 'credential-misused'),
        gt(custodyEntry.at, now - ONE_ENTRY_EVERY_MS),
      ),
    )
    .orderBy(desc(custodySubject.sequence))
    .limit(1);
  return last !== undefined;
}

async function quarantine(
  tx: Tx,
  row: { credential: CredentialRow; device: DeviceRow },
  now: number,
): Promise<NewEntry[]> {
  const ended = await tx
    .update(credential)
    .set({
      state: 'revoked',
      revokedAt: now,
      endReason: `quarantined: ${row.credential.label} was used again`,
    })
    .where(
      and(
        eq(credential.familyId, row.credential.familyId),
        inArray(credential.state, ['issued', 'in-use', 'superseded']),
      ),
    )
    .returning({ id: credential.id, label: credential.label });
  return ended.map((member) => ({
    kind: 'credential-quarantined' as const,
    actor: SERVICE_ACTOR,
    subjects: [
      { kind: 'credential' as const, id: member.id },
      { kind: 'device' as const, id: row.device.id },
    ],
    detail: { label: member.label, why: `${row.credential.label} was used after it had ended` },
  }));
}
