import { and, eq, isNull, like } from 'drizzle-orm';
import { z } from 'zod';
import { invitation, personRole, user } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import { Refusal } from '@/lib/platform/errors';
import { newId, newSecret } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';
import { INVITATION_LIVES_MS } from './invitePerson';
import { ROLES } from './permissions';
import { isOpen } from './readInvitation';
import { tokenHash } from './tokenHash';

export const FirstInvitation = z.strictObject({
  email: z.string().trim().toLowerCase().max(254).pipe(z.email('--email takes an e-mail address')),
  name: z
    .string()
    .trim()
    .min(1, '--name is needed')
    .max(120)
    .regex(/^[^\p{C}]*$/u, '--name holds characters that cannot be seen'),
  role: z.enum(ROLES, `--role is one of ${ROLES.join(', ')}`),
  /** Although somebody here could invite. */
  force: z.boolean(),
});
export type FirstInvitation = z.infer<typeof FirstInvitation>;

/**
 * Invite somebody from the command line: the first IT administrator of a house, or one more with force, when nobody who
 * is here can get in any more. Whoever runs it reads the database and its keys anyway; the log says that it was done.
 *
 * @returns the address that works once, within seven days
 * @throws Refusal `not-possible` when an IT administrator is here or invited and force is not given, or when they have an account
 */
export async function inviteFirst(
  services: Pick<Services, 'write' | 'clock' | 'env'>,
  wanted: FirstInvitation,
): Promise<{ address: string; expiresAt: number }> {
  const now = services.clock.now();
  const token = newSecret();
  const expiresAt = now + INVITATION_LIVES_MS;
  await services.write(async (tx) => {
    const known = await administrators(tx, now);
    if (known > 0 && !wanted.force)
      throw new Refusal(
        'not-possible',
        'There is an IT administrator, or one is invited: they can invite people in the Key room. --force does it all the same, and the log says so.',
      );
    const personId = await reserved(tx, wanted, now);
    const id = newId();
    await tx.insert(invitation).values({
      id,
      email: wanted.email,
      name: wanted.name,
      roles: wanted.role,
      tokenHash: tokenHash(token),
      // Nobody here invites them: they stand for themselves.
      invitedBy: personId,
      createdAt: now,
      expiresAt,
    });
    await appendEntries(tx, now, [
      {
        kind: 'person-invited',
        actor: SERVICE_ACTOR,
        subjects: [{ kind: 'invitation', id }],
        detail: { name: wanted.name, roles: [wanted.role], how: 'command', forced: known > 0 },
      },
    ]);
  });
  return { address: `${services.env.BELLKEEP_ORIGIN}/invite/${token}`, expiresAt };
}

/** IT administrators who are here, and open invitations for one. */
async function administrators(tx: Tx, now: number): Promise<number> {
  const here = await tx
    .select({ id: user.id })
    .from(personRole)
    .innerJoin(user, eq(user.id, personRole.personId))
    .where(and(eq(personRole.role, 'itadmin'), isNull(user.leftAt)));
  const invited = await tx
    .select({ id: invitation.id })
    .from(invitation)
    .where(and(like(invitation.roles, '%itadmin%'), isOpen(now)));
  return here.length + invited.length;
}

/** The row that the invitation names as its author: theirs, closed until they take it up. */
async function reserved(tx: Tx, wanted: FirstInvitation, now: number): Promise<string> {
  const [before] = await tx.select().from(user).where(eq(user.email, wanted.email)).limit(1);
  if (before?.leftAt === null)
    throw new Refusal('not-possible', `${wanted.email} has an account. Have a new password set at /forgot.`);
  if (before) return before.id;
  const id = newId();
  const at = new Date(now);
  await tx
    .insert(user)
    .values({ id, email: wanted.email, name: wanted.name, leftAt: now, createdAt: at, updatedAt: at });
  return id;
}
