import { and, eq, isNull, ne } from 'drizzle-orm';
import { personRole, user } from '@/db/schema';
import type { Tx } from '@/db/write';
import { Refusal } from '@/lib/platform/errors';
import { ROLES, type Role } from './permissions';

/** Roles of a person in the order of the table of roles, in the caller's transaction. */
export async function rolesHeld(tx: Tx, personId: string): Promise<Role[]> {
  const rows = await tx
    .select({ role: personRole.role })
    .from(personRole)
    .where(eq(personRole.personId, personId));
  return ROLES.filter((role) => rows.some((row) => row.role === role));
}

/**
 * Somebody else who is here must be able to invite people and give roles.
 *
 * @throws Refusal `not-possible` when this person is the last IT administrator
 */
export async function keepAnItadmin(tx: Tx, without: { id: string; name: string }): Promise<void> {
  const [other] = await tx
    .select({ id: user.id })
    .from(personRole)
    .innerJoin(user, eq(user.id, personRole.personId))
    .where(and(eq(personRole.role, 'itadmin'), ne(user.id, without.id), isNull(user.leftAt)))
    .limit(1);
  if (!other)
    throw new Refusal(
      'not-possible',
      `${without.name} is the last IT administrator. Give somebody else the role first.`,
    );
}
