import { z } from 'zod';
import { personRole } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { findPerson } from './findPerson';
import { ROLE_NAMES, ROLES, type Role } from './permissions';
import { rolesHeld } from './rolesHeld';
import { deleteSessions } from './sessions';

export const RoleChange = z.strictObject({ role: z.enum(ROLES), held: z.boolean() });

export interface RolesNow {
  roles: Role[];
  sessionsEnded: number;
}

/**
 * Give a person a role. Their sessions end at once, so that the next one starts with what they may do now.
 *
 * @throws Refusal `not-found`, `not-possible` when they hold it already
 */
export async function giveRole(
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
    if (before.includes(role))
      throw new Refusal('not-possible', `${person.name} is ${ROLE_NAMES[role].toLowerCase()} already.`);
    await tx.insert(personRole).values({ personId, role, givenBy: by.id, givenAt: now });
    const answer = {
      roles: [...before, role],
      sessionsEnded: await deleteSessions(tx, personId),
    };
    await appendEntries(tx, now, [
      {
        kind: 'role-given',
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
