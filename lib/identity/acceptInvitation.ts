import { and, eq } from 'drizzle-orm';
import { z } from 'zod';
import { invitation, personRole, personWard, user, ward } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { Refusal } from '@/lib/platform/errors';
import { newId } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';
import { checkNewPassword } from './changePassword';
import { hashPassword } from './password';
import { isOpen, readInvitation, rolesOf, wardsOf } from './readInvitation';
import { storePassword } from './storePassword';
import { tokenHash } from './tokenHash';

export const Acceptance = z.strictObject({
  token: z.string().min(1).max(200),
  password: z.string().min(1).max(1024),
});

const notOpen = () =>
  new Refusal(
    'not-found',
    'This invitation is not open: it was taken up, withdrawn, or its seven days are over. Ask for another one.',
  );

/**
 * Take up an invitation: account, password, roles and wards come into being in one transaction, or not at all. Of two
 * at the same moment one does it.
 *
 * @returns the address to sign in with
 * @throws Refusal `not-found`, `body-invalid`
 */
export async function acceptInvitation(
  services: Pick<Services, 'read' | 'write' | 'clock' | 'env'>,
  wanted: z.infer<typeof Acceptance>,
): Promise<{ email: string }> {
  const open = await readInvitation(services, wanted.token);
  if (!open) throw notOpen();
  checkNewPassword(services, wanted.password, open, 'password');
  const hash = await hashPassword(wanted.password);
  const now = services.clock.now();
  return await services.write(async (tx) => {
    // From this line's commit on the token is used; a repeat finds nothing open.
    const [taken] = await tx
      .update(invitation)
      .set({ acceptedAt: now })
      .where(and(eq(invitation.tokenHash, tokenHash(wanted.token)), isOpen(now)))
      .returning();
    if (!taken) throw notOpen();
    const personId = await joinByInvitation(tx, taken, now);
    await storePassword(tx, personId, hash, now);
    return { email: taken.email };
  });
}

/**
 * What an invitation that was just taken up brings: the person with their roles and wards, in the caller's transaction.
 *
 * @returns the person's id
 */
export async function joinByInvitation(
  tx: Tx,
  taken: typeof invitation.$inferSelect,
  now: number,
): Promise<string> {
  const personId = await makePerson(tx, taken, now);
  const roles = rolesOf(taken.roles);
  await tx
    .insert(personRole)
    .values(roles.map((role) => ({ personId, role, givenBy: taken.invitedBy, givenAt: now })));
  const wards = await giveWards(tx, personId, wardsOf(taken.wardIds));
  await appendEntries(tx, now, [
    {
      kind: 'person-joined',
      actor: { kind: 'person', id: personId, label: taken.name },
      subjects: [
        { kind: 'person', id: personId },
        { kind: 'invitation', id: taken.id },
        { kind: 'person', id: taken.invitedBy },
      ],
      after: { name: taken.name, roles, wards },
    },
  ]);
  return personId;
}

/** A new person, or the same one back again: their id stays, so that all they ever did stays theirs. */
async function makePerson(tx: Tx, from: typeof invitation.$inferSelect, now: number): Promise<string> {
  const at = new Date(now);
  const facts = { name: from.name, jobTitle: from.jobTitle, emailVerified: true, updatedAt: at };
  const [before] = await tx.select().from(user).where(eq(user.email, from.email)).limit(1);
  if (before) {
    if (before.leftAt === null) throw new Refusal('not-possible', 'This address has an account already.');
    await tx
      .update(user)
      .set({ ...facts, leftAt: null })
      .where(eq(user.id, before.id));
    return before.id;
  }
  const id = newId();
  await tx.insert(user).values({ id, email: from.email, ...facts, createdAt: at });
  return id;
}

/** Wards that are gone since the invitation are passed over. @returns their names */
async function giveWards(tx: Tx, personId: string, wardIds: string[]): Promise<string[]> {
  const names: string[] = [];
  for (const wardId of wardIds) {
    const [found] = await tx.select({ name: ward.name }).from(ward).where(eq(ward.id, wardId)).limit(1);
    if (!found) continue;
    await tx.insert(personWard).values({ personId, wardId });
    names.push(found.name);
  }
  return names;
}
