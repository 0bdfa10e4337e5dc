import { asc, eq } from 'drizzle-orm';
import { personRole, personWard, twoFactor, user, ward } from '@/db/schema';
import type { Authorized } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';
import { passkeysOf } from './passkeys/passkeysOf';
import { ROLES, type Role } from './permissions';
import { type SessionLine, sessionsOf } from './sessions';

export interface PersonDescription {
  id: string;
  name: string;
  email: string;
  jobTitle: string | null;
  joinedAt: number;
  leftAt: number | null;
  lastSignedInAt: number | null;
  secondFactor: 'on' | 'begun' | 'none';
  passkeys: number;
  roles: { role: Role; givenBy: string | null; givenAt: number }[];
  wardIds: string[];
  sessions: SessionLine[];
}

/** Everything that the page of a person shows; null when there is no such person. */
export async function describePerson(
  services: Pick<Services, 'read' | 'clock'>,
  _by: Authorized<'people.read'>,
  id: string,
): Promise<PersonDescription | null> {
  const { read } = services;
  const [[person], roles, wards, [factor], sessions, passkeys] = await Promise.all([
    read.select().from(user).where(eq(user.id, id)).limit(1),
    read
      .select({ role: personRole.role, givenBy: user.name, givenAt: personRole.givenAt })
      .from(personRole)
      .leftJoin(user, eq(user.id, personRole.givenBy))
      .where(eq(personRole.personId, id)),
    read.select({ wardId: personWard.wardId }).from(personWard).where(eq(personWard.personId, id)),
    read.select({ verified: twoFactor.verified }).from(twoFactor).where(eq(twoFactor.userId, id)).limit(1),
    sessionsOf(services, id),
    passkeysOf(services, id),
  ]);
  if (!person) return null;
  return {
    id,
    name: person.name,
    email: person.email,
    jobTitle: person.jobTitle,
    joinedAt: person.createdAt.getTime(),
    leftAt: person.leftAt,
    lastSignedInAt: person.lastSignedInAt,
    secondFactor: person.twoFactorEnabled || passkeys.length > 0 ? 'on' : factor ? 'begun' : 'none',
    passkeys: passkeys.length,
    roles: ROLES.flatMap((role) => roles.filter((row) => row.role === role)),
    wardIds: wards.map((row) => row.wardId).sort(),
    sessions,
  };
}

/** All wards by name, to choose from. */
export const listWards = (services: Pick<Services, 'read'>): Promise<{ id: string; name: string }[]> =>
  services.read.select({ id: ward.id, name: ward.name }).from(ward).orderBy(asc(ward.name));
