import { eq } from 'drizzle-orm';
import { personRole, personWard, user } from '@/db/schema';
import type { Person } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';
import { authOf } from './auth';
import type { Role } from './permissions';

export interface SignedIn extends Person {
  /** Holds a role that needs a second factor and has not set one up. */
  needsSecondFactor: boolean;
}

/**
 * Who a request's session cookie belongs to, with roles and wards as they are at this moment: a role that was taken
 * away is gone with the next request. Null when signed out, ended, or left.
 */
export async function readPerson(
  services: Pick<Services, 'database' | 'read' | 'write' | 'clock' | 'env' | 'log'>,
  headers: Headers,
): Promise<SignedIn | null> {
  const found = await authOf(services).api.getSession({ headers });
  if (!found) return null;
  const [[person], roles, wards] = await Promise.all([
    services.read.select().from(user).where(eq(user.id, found.user.id)).limit(1),
    services.read
      .select({ role: personRole.role })
      .from(personRole)
      .where(eq(personRole.personId, found.user.id)),
    services.read
      .select({ wardId: personWard.wardId })
      .from(personWard)
      .where(eq(personWard.personId, found.user.id)),
  ]);
  if (!person || person.leftAt !== null) return null;
  const held: Role[] = roles.map((row) => row.role);
  return {
    id: person.id,
    name: person.name,
    email: person.email,
    jobTitle: person.jobTitle,
    roles: held,
    wardIds: wards.map((row) => row.wardId),
    sessionId: found.session.id,
    needsSecondFactor: held.includes('itadmin') && person.twoFactorEnabled !== true,
  };
}
