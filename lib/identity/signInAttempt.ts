import { and, eq, gt } from 'drizzle-orm';
import { signInAttempt } from '@/db/schema';
import { newSecret } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';
import { tokenHash } from './tokenHash';

type Purpose = (typeof signInAttempt.$inferSelect)['purpose'];
type Needs = Pick<Services, 'write' | 'clock' | 'secrets'>;

const LIVES_MS = 600_000;
const boxContext = (keyHash: string) => `sign-in-attempt ${keyHash}`;

/**
 * Keep what must be known when a browser comes back, for ten minutes.
 *
 * @returns the handle that the browser holds; only its hash is kept
 */
export async function keepAttempt(
  services: Needs,
  purpose: Purpose,
  state: Record<string, unknown>,
  personId: string | null = null,
): Promise<string> {
  const handle = newSecret();
  const keyHash = tokenHash(handle);
  const sealedState = services.secrets.seal(JSON.stringify(state), boxContext(keyHash));
  await services.write(async (tx) => {
    await tx.insert(signInAttempt).values({
      keyHash,
      purpose,
      personId,
      sealedState,
      expiresAt: services.clock.now() + LIVES_MS,
    });
  });
  return handle;
}

/** Take an attempt up: once, for this purpose, by this person. Null when there is none that may still be taken. */
export async function takeAttempt(
  services: Needs,
  purpose: Purpose,
  handle: string,
  personId: string | null = null,
): Promise<Record<string, unknown> | null> {
  const keyHash = tokenHash(handle);
  const row = await services.write(async (tx) => {
    // Gone with this commit, whatever comes of it: a second try with the same handle finds nothing.
    const [taken] = await tx
      .delete(signInAttempt)
      .where(
        and(
          eq(signInAttempt.keyHash, keyHash),
          eq(signInAttempt.purpose, purpose),
          gt(signInAttempt.expiresAt, services.clock.now()),
        ),
      )
      .returning();
    return taken;
  });
  if (!row || row.personId !== personId) return null;
  return JSON.parse(services.secrets.open(row.sealedState, boxContext(keyHash))) as Record<string, unknown>;
}
