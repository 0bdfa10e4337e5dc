import { isIP } from 'node:net';
import { asc, eq } from 'drizzle-orm';
import { passkey } from '@/db/schema';
import type { Services } from '@/lib/platform/services';

export interface PasskeyLine {
  id: string;
  name: string;
  backedUp: boolean;
  createdAt: number;
  lastUsedAt: number | null;
}

/** A person's passkeys, the oldest first. */
export const passkeysOf = (services: Pick<Services, 'read'>, personId: string): Promise<PasskeyLine[]> =>
  services.read
    .select({
      id: passkey.id,
      name: passkey.name,
      backedUp: passkey.backedUp,
      createdAt: passkey.createdAt,
      lastUsedAt: passkey.lastUsedAt,
    })
    .from(passkey)
    .where(eq(passkey.personId, personId))
    .orderBy(asc(passkey.createdAt));

export async function hasPasskey(services: Pick<Services, 'read'>, personId: string): Promise<boolean> {
  const [row] = await services.read
    .select({ id: passkey.id })
    .from(passkey)
    .where(eq(passkey.personId, personId))
    .limit(1);
  return row !== undefined;
}

/** Browsers make passkeys for names only: a house that is reached by a bare address has none (WebAuthn, 5.1.2). */
export const passkeysPossible = ({ env }: Pick<Services, 'env'>): boolean =>
  isIP(new URL(env.BELLKEEP_ORIGIN).hostname.replace(/^\[|\]$/g, '')) === 0;

/** Who we are to a browser: the host of our address (WebAuthn, 5.1.3). */
export const relyingParty = ({ env }: Pick<Services, 'env'>) => ({
  id: new URL(env.BELLKEEP_ORIGIN).hostname,
  name: `Bellkeep, ${env.BELLKEEP_HOSPITAL}`,
  origin: new URL(env.BELLKEEP_ORIGIN).origin,
});
