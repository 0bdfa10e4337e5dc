import { and, eq, inArray, isNull } from 'drizzle-orm';
import { credential, enrolmentCode, listeningSession } from '@/db/schema';
import type { Tx } from '@/db/write';
import type { Actor, NewEntry } from '@/lib/custody/entry';

/** End a device's open listening session, in the caller's transaction. @returns the entries that tell of it */
export async function endSessions(
  tx: Tx,
  deviceId: string,
  actor: Actor,
  now: number,
  why: { code: 'device-moved' | 'device-lost'; words: string },
): Promise<NewEntry[]> {
  const closed = await tx
    .update(listeningSession)
    .set({ closedAt: now, closedBy: actor.id, closedWhy: why.code })
    .where(and(eq(listeningSession.deviceId, deviceId), isNull(listeningSession.closedAt)))
    .returning();
  return closed.map((session) => ({
    kind: 'session-closed',
    actor,
    subjects: [
      { kind: 'session', id: session.id },
      { kind: 'device', id: deviceId },
      { kind: 'encounter', id: session.encounterId },
    ],
    detail: { number: session.number, why: why.words },
  }));
}

/** Revoke a device's credentials and withdraw its codes, in the caller's transaction. @returns the entries that tell of it */
export async function endCredentials(
  tx: Tx,
  deviceId: string,
  actor: Actor,
  now: number,
  why: string,
): Promise<NewEntry[]> {
  await tx
    .update(enrolmentCode)
    .set({ withdrawnAt: now })
    .where(
      and(
        eq(enrolmentCode.deviceId, deviceId),
        isNull(enrolmentCode.usedAt),
        isNull(enrolmentCode.withdrawnAt),
      ),
    );
  const ended = await tx
    .update(credential)
    .set({ state: 'revoked', revokedAt: now, endReason: why })
    .where(
      and(eq(credential.deviceId, deviceId), inArray(credential.state, ['issued', 'in-use', 'superseded'])),
    )
    .returning({ id: credential.id, label: credential.label });
  return ended.map((row) => ({
    kind: 'credential-revoked',
    actor,
    subjects: [
      { kind: 'credential', id: row.id },
      { kind: 'device', id: deviceId },
    ],
    detail: { label: row.label, why },
  }));
}
