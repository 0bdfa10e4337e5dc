import { and, eq, isNull } from 'drizzle-orm';
import { z } from 'zod';
import { invitation, user } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { enqueueMail } from '@/lib/mail/enqueue';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import { newId, newSecret } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';
import { invitationLetter } from './letters';
import { ROLES } from './permissions';
import { isOpen } from './readInvitation';
import { checkWards } from './setWards';
import { tokenHash } from './tokenHash';

export const INVITATION_LIVES_MS = 7 * 86_400_000;

const words = (most: number) =>
  z
    .string()
    .trim()
    .max(most)
    .regex(/^[^\p{C}]*$/u, 'It holds characters that cannot be seen.');

export const Invitation = z.strictObject({
  email: z.string().trim().toLowerCase().max(254).pipe(z.email('This is no e-mail address.')),
  name: words(120).min(1, 'A name is needed.'),
  jobTitle: words(120)
    .transform((text) => text || null)
    .nullable(),
  roles: z
    .array(z.enum(ROLES))
    .min(1, 'Choose at least one role.')
    .transform((roles) => ROLES.filter((role) => roles.includes(role))),
  wardIds: z.array(z.string().min(1).max(100)).max(200),
});
export type Invitation = z.infer<typeof Invitation>;

interface Invited {
  id: string;
  expiresAt: number;
}

/**
 * Invite somebody: a mail with an address that works once, within seven days. Only the token's hash is kept.
 *
 * @throws Refusal `not-possible` when they are here or have an open invitation, `body-invalid` for an unknown ward
 */
export async function invitePerson(
  services: Pick<Services, 'write' | 'clock' | 'env'>,
  by: Authorized<'people.write'>,
  wanted: Invitation,
  remember?: (tx: Tx, answer: Invited) => Promise<void>,
): Promise<Invited> {
  const now = services.clock.now();
  const token = newSecret();
  return await services.write(async (tx) => {
    await checkFree(tx, wanted.email, now);
    const wards = await checkWards(tx, wanted.wardIds);
    const answer = { id: newId(), expiresAt: now + INVITATION_LIVES_MS };
    await tx.insert(invitation).values({
      ...answer,
      email: wanted.email,
      name: wanted.name,
      jobTitle: wanted.jobTitle,
      roles: wanted.roles.join(','),
      wardIds: wards.map((ward) => ward.id).join(','),
      tokenHash: tokenHash(token),
      invitedBy: by.id,
      createdAt: now,
    });
    await appendEntries(tx, now, [
      {
        kind: 'person-invited',
        actor: personActor(by, 'people.write'),
        subjects: [{ kind: 'invitation', id: answer.id }],
        detail: { name: wanted.name, roles: wanted.roles, wards: wards.map((ward) => ward.name) },
      },
    ]);
    await enqueueMail(tx, now, invitationLetter(services, wanted, by.name, token));
    await remember?.(tx, answer);
    return answer;
  });
}

async function checkFree(tx: Tx, email: string, now: number): Promise<void> {
  const [here] = await tx
    .select({ name: user.name })
    .from(user)
    .where(and(eq(user.email, email), isNull(user.leftAt)))
    .limit(1);
  if (here)
    throw new Refusal(
      'not-possible',
      `${here.name} has an account with this address. Give the role on their page.`,
    );
  const [open] = await tx
    .select({ name: invitation.name })
    .from(invitation)
    .where(and(eq(invitation.email, email), isOpen(now)))
    .limit(1);
  if (open)
    throw new Refusal(
      'not-possible',
      `${open.name} has an open invitation to this address. Send that one again, or withdraw it.`,
    );
}
