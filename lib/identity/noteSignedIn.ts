import { eq } from 'drizzle-orm';
import { user } from '@/db/schema';
import { appendEntries } from '@/lib/custody/append';
import type { Services } from '@/lib/platform/services';

/** The session exists: say so in the log and on the person. */
export async function noteSignedIn(
  services: Pick<Services, 'write' | 'clock'>,
  personId: string,
  secondFactor: 'authenticator' | 'recovery-code' | 'passkey' | 'provider' | null,
): Promise<void> {
  const now = services.clock.now();
  await services.write(async (tx) => {
    const [person] = await tx
      .update(user)
      .set({ lastSignedInAt: now })
      .where(eq(user.id, personId))
      .returning({ name: user.name });
    if (!person) return;
    await appendEntries(tx, now, [
      {
        kind: 'signed-in',
        actor: { kind: 'person', id: personId, label: person.name },
        subjects: [{ kind: 'person', id: personId }],
        ...(secondFactor ? { detail: { secondFactor } } : {}),
      },
    ]);
  });
}
