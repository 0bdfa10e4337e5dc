import { and, eq, isNull } from 'drizzle-orm';
import { z } from 'zod';
import { account, passkey, passwordReset, personRole, personWard, twoFactor, user, ward } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { findPerson } from './findPerson';
import { keepAnItadmin, rolesHeld } from './rolesHeld';
import { deleteSessions } from './sessions';

export const Leaving = z.strictObject({ reason: z.string().trim().min(5).max(500) });

interface Left {
  leftAt: number;
  sessionsEnded: number;
}

/**
 * Somebody left: sessions, password, second factor, roles and wards go at once; the person stays named in everything
 * they did.
 *
 * @throws Refusal `not-found`, `not-possible` for oneself and for the last IT administrator
 */
export async function personLeaves(
  services: Pick<Services, 'write' | 'clock'>,
  by: Authorized<'people.write'>,
  personId: string,
  reason: string,
  remember?: (tx: Tx, answer: Left) => Promise<void>,
): Promise<Left> {
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const person = await findPerson(tx, personId);
    if (person.id === by.id) throw new Refusal('not-possible', 'Somebody else has to say that you left.');
    const roles = await rolesHeld(tx, personId);
    if (roles.includes('itadmin')) await keepAnItadmin(tx, person);
    const wards = await tx
      .select({ name: ward.name })
      .from(personWard)
      .innerJoin(ward, eq(ward.id, personWard.wardId))
      .where(eq(personWard.personId, personId))
      .orderBy(ward.name);
    const sessionsEnded = await deleteSessions(tx, personId);
    await tx.delete(account).where(eq(account.userId, personId));
    await tx.delete(twoFactor).where(eq(twoFactor.userId, personId));
    await tx.delete(passkey).where(eq(passkey.personId, personId));
    await tx.delete(personRole).where(eq(personRole.personId, personId));
    await tx.delete(personWard).where(eq(personWard.personId, personId));
    await tx
      .update(passwordReset)
      .set({ usedAt: now })
      .where(and(eq(passwordReset.personId, personId), isNull(passwordReset.usedAt)));
    await tx
      .update(user)
      .set({ leftAt: now, twoFactorEnabled: false, updatedAt: new Date(now) })
      .where(eq(user.id, personId));
    await appendEntries(tx, now, [
      {
        kind: 'person-left',
        actor: personActor(by, 'people.write'),
        subjects: [{ kind: 'person', id: personId }],
        detail: { name: person.name, reason, sessionsEnded },
        before: { roles, wards: wards.map((row) => row.name) },
      },
    ]);
    const answer = { leftAt: now, sessionsEnded };
    await remember?.(tx, answer);
    return answer;
  });
}
