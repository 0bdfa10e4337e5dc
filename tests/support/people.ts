import { createHmac } from 'node:crypto';
import { eq } from 'drizzle-orm';
import { account, personRole, personWard, session, user, ward } from '@/db/schema';
import { authOf, SESSION_SECONDS } from '@/lib/identity/auth';
import { hashPassword } from '@/lib/identity/password';
import type { Permission, Role } from '@/lib/identity/permissions';
import type { Authorized } from '@/lib/platform/authority';
import { newId } from '@/lib/platform/ids';
import type { House } from './services';

export const PASSWORD = 'violet ladder seven herons';
/** Argon2id costs time on purpose: the same password is hashed once for a test file. */
let hashed: Promise<string> | undefined;

export interface TestPerson {
  id: string;
  name: string;
  email: string;
  roles: Role[];
}

export interface NewPerson {
  name?: string;
  roles: Role[];
  wardIds?: string[];
  /** As if it had been set up; on for IT administrators unless told. */
  secondFactor?: boolean;
}

/** Somebody with an account, as if they had taken up an invitation long ago. */
export async function addPerson(house: House, wanted: NewPerson): Promise<TestPerson> {
  hashed ??= hashPassword(PASSWORD);
  const password = await hashed;
  const id = newId();
  const name = wanted.name ?? `Robin ${id.slice(0, 8)}`;
  const email = `${id.slice(0, 8)}@harrowmere.example`;
  const at = new Date(house.clock.now());
  await house.services.write(async (tx) => {
    await tx.insert(user).values({
      id,
      name,
      email,
      emailVerified: true,
      createdAt: at,
      updatedAt: at,
      twoFactorEnabled: wanted.secondFactor ?? wanted.roles.includes('itadmin'),
    });
    await tx.insert(account).values({
      id: newId(),
      accountId: id,
      providerId: 'credential',
      userId: id,
      password,
      createdAt: at,
      updatedAt: at,
    });
    for (const role of wanted.roles)
      await tx.insert(personRole).values({ personId: id, role, givenAt: at.getTime() });
    for (const wardId of wanted.wardIds ?? []) await tx.insert(personWard).values({ personId: id, wardId });
  });
  return { id, name, email, roles: wanted.roles };
}

/** A ward. @returns its id */
export async function addWard(house: House, name: string): Promise<string> {
  const id = newId();
  await house.services.write(async (tx) => {
    await tx.insert(ward).values({ id, name, createdAt: house.clock.now() });
  });
  return id;
}

/** A session of a person, as sign-in would have made it. @returns the Cookie field that carries it */
export async function sessionOf(house: House, person: Pick<TestPerson, 'id'>): Promise<string> {
  const context = await authOf(house.services).$context;
  const made = await context.internalAdapter.createSession(person.id);
  // By the clock of the house, which may be ahead of the one that the session was made by.
  const at = new Date(house.clock.now());
  const expiresAt = new Date(at.getTime() + SESSION_SECONDS * 1000);
  await house.services.write(async (tx) => {
    await tx
      .update(session)
      .set({ createdAt: at, updatedAt: at, expiresAt })
      .where(eq(session.token, made.token));
  });
  const signature = createHmac('sha256', house.services.env.BELLKEEP_AUTH_SECRET)
    .update(made.token)
    .digest('base64');
  return `${context.authCookies.sessionToken.name}=${encodeURIComponent(`${made.token}.${signature}`)}`;
}

/** Somebody who is signed in. */
export async function signedIn(house: House, wanted: NewPerson): Promise<TestPerson & { cookie: string }> {
  const person = await addPerson(house, wanted);
  return { ...person, cookie: await sessionOf(house, person) };
}

/** Authority as `lib/http` gives it, for calling a verb without a route. */
export function authorityOf<P extends Permission>(
  person: TestPerson,
  more: { wardIds?: string[]; sessionId?: string } = {},
): Authorized<P> {
  return {
    id: person.id,
    name: person.name,
    email: person.email,
    jobTitle: null,
    roles: person.roles,
    wardIds: more.wardIds ?? [],
    sessionId: more.sessionId ?? 'no session',
  } as unknown as Authorized<P>;
}
