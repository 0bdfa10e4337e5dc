import { and, eq, ne } from 'drizzle-orm';
import { passkey, session } from '@/db/schema';
import { appendEntries } from '@/lib/custody/append';
import { enqueueMail } from '@/lib/mail/enqueue';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { noticeLetter } from '../letters';
import { deleteSessions } from '../sessions';
import { provePresence } from './addPasskey';

/**
 * Take one of one's own passkeys away; sessions elsewhere end.
 *
 * @throws Refusal `not-found` when it is not one's own or is gone, `body-invalid` for a wrong password
 */
export async function removePasskey(
  services: Pick<Services, 'read' | 'write' | 'clock' | 'env' | 'secrets'>,
  by: Authorized<'self'>,
  id: string,
  password: string | undefined,
): Promise<{ removed: string }> {
  const mine = and(eq(passkey.id, id), eq(passkey.personId, by.id));
  // What is not there is said before a password is asked for: the answer tells nothing of others' keys.
  const [there] = await services.read.select({ id: passkey.id }).from(passkey).where(mine).limit(1);
  if (!there) throw new Refusal('not-found');
  await provePresence(services, by, password);
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const [gone] = await tx.delete(passkey).where(mine).returning({ name: passkey.name });
    if (!gone) throw new Refusal('not-found');
    await deleteSessions(tx, by.id, ne(session.id, by.sessionId));
    await appendEntries(tx, now, [
      {
        kind: 'passkey-removed',
        actor: personActor(by, 'self'),
        subjects: [{ kind: 'person', id: by.id }],
        detail: { name: gone.name },
      },
    ]);
    await enqueueMail(tx, now, noticeLetter(services, by.email, 'passkey-removed'));
    return { removed: gone.name };
  });
}
