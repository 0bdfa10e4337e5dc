import { and, eq } from 'drizzle-orm';
import { personRole } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { findPerson } from './findPerson';
import type { RolesNow } from './giveRole';
import { ROLE_NAMES, type Role } from './permissions';
import { keepAnItadmin, rolesHeld } from './rolesHeld';
import { deleteSessions } from './sessions';

/**
 * Take a role away. From its commit on no request has it, and the person's sessions are ended.
 *
 * @throws Refusal `not-found`, `not-possible` when they do not hold it, it is their only one, or they are the last IT administrator
 */
export async function takeRole(
  services: Pick<Services, 'write' | 'clock'>,
  by: Authorized<'people.write'>,
  personId: string,
  role: Role,
  remember?: (tx: Tx, answer: RolesNow) => Promise<void>,
): Promise<RolesNow> {
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const person = await findPerson(tx, personId);
    const before = await rolesHeld(tx, personId);
    if (!before.includes(role))
      throw new Refusal('not-possible', `${person.name} is not ${ROLE_NAMES[role].toLowerCase()}.`);
    if (role === 'itadmin') await keepAnItadmin(tx, person);
    if (before.length === 1)
      throw new Refusal(
        'not-possible',
        `It is the only role of ${person.name}. Give another one first, or say that they left.`,
      );
    await tx.delete(personRole).where(and(eq(personRole.personId, personId), eq(personRole.role, role)));
    const answer = {
      roles: before.filter((held) => held !== role),
      sessionsEnded: await deleteSessions(tx, personId),
    };
    await appendEntries(tx, now, [
      {
        kind: 'role-taken',
        actor: personActor(by, 'people.write'),
        subjects: [{ kind: 'person', id: personId }],
        detail: { role, name: person.name, sessionsEnded: answer.sessionsEnded },
        before: { roles: before },
        after: { roles: answer.roles },
      },
    ]);
    await remember?.(tx, answer);
    return answer;
  });
}
