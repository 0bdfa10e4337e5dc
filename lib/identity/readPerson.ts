import { and, eq, lt } from 'drizzle-orm';
import { personRole, personWard, session, user } from '@/db/schema';
import type { Person } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';
import { authOf, IDLE_MS, SESSION_SECONDS } from './auth';
import { hasPasskey } from './passkeys/passkeysOf';
import type { Role } from './permissions';

export interface SignedIn extends Person {
  /** Holds a role that needs a second factor and has not set one up. */
  needsSecondFactor: boolean;
}

type Needs = Pick<Services, 'database' | 'read' | 'write' | 'clock' | 'env' | 'log'>;

/** How exactly the last use of a session is known; a write at every request would be one too many. */
const TOUCH_MS = 300_000;

/**
 * Who a request's session cookie belongs to, with roles and wards as they are at this moment: a role that was taken
 * away is gone with the next request. Null when signed out, ended, idle too long, or left.
 */
export async function readPerson(services: Needs, headers: Headers): Promise<SignedIn | null> {
  // Without a cookie there is nothing to ask for.
  if (!headers.has('cookie')) return null;
  const found = await authOf(services).api.getSession({ headers });
  if (!found || !(await stillGoing(services, found.session))) return null;
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
    // Whoever has a passkey and no authenticator signs in by the passkey alone (signIn.ts).
    needsSecondFactor:
      held.includes('itadmin') &&
      person.twoFactorEnabled !== true &&
      !(await hasPasskey(services, person.id)),
  };
}

interface FoundSession {
  id: string;
  createdAt: Date;
  updatedAt: Date;
}

/** Neither a whole shift old nor unused for too long; notes that it is in use. */
async function stillGoing(services: Needs, found: FoundSession): Promise<boolean> {
  const now = services.clock.now();
  const idleMs = now - found.updatedAt.getTime();
  if (idleMs > IDLE_MS || now - found.createdAt.getTime() > SESSION_SECONDS * 1000) {
    await services.write(async (tx) => {
      await tx.delete(session).where(eq(session.id, found.id));
    });
    return false;
  }
  if (idleMs > TOUCH_MS) {
    await services.write(async (tx) => {
      await tx
        .update(session)
        .set({ updatedAt: new Date(now) })
        .where(and(eq(session.id, found.id), lt(session.updatedAt, new Date(now))));
    });
  }
  return true;
}
