import { and, eq, gt, isNull, ne, or } from 'drizzle-orm';
import {
  type CryptoKey,
  calculateJwkThumbprint,
  exportJWK,
  generateKeyPair,
  importJWK,
  type JWK,
} from 'jose';
import { signingKey } from '@/db/schema';
import { appendEntries } from '@/lib/custody/append';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import type { Services } from '@/lib/platform/services';

export type SigningKeyRow = typeof signingKey.$inferSelect;
export type SigningUse = SigningKeyRow['use'];

type Needs = Pick<Services, 'read' | 'write' | 'clock' | 'secrets'>;

const boxContext = (kid: string) => `signing-key ${kid}`;

const isCurrent = (use: SigningUse) =>
  and(eq(signingKey.use, use), isNull(signingKey.supersededAt), isNull(signingKey.retiredAt));

async function readCurrent(services: Needs, use: SigningUse): Promise<SigningKeyRow | null> {
  const [row] = await services.read.select().from(signingKey).where(isCurrent(use)).limit(1);
  return row ?? null;
}

/** An Ed25519 key pair as a row; its `kid` is the RFC 7638 thumbprint, so a kid can never name two keys. */
export async function makeSigningKey(services: Needs, use: SigningUse): Promise<SigningKeyRow> {
  const pair = await generateKeyPair('EdDSA', { crv: 'Ed25519', extractable: true });
  const publicJwk = await exportJWK(pair.publicKey);
  const kid = await calculateJwkThumbprint(publicJwk, 'sha256');
  return {
    kid,
    algorithm: 'EdDSA',
    use,
    publicJwk: JSON.stringify({ ...publicJwk, kid, alg: 'EdDSA', use: 'sig' }),
    sealedPrivateJwk: services.secrets.seal(
      JSON.stringify(await exportJWK(pair.privateKey)),
      boxContext(kid),
    ),
    createdAt: services.clock.now(),
    supersededAt: null,
    retiredAt: null,
    compromisedAt: null,
  };
}

/**
 * The key that signs now for `use`; the first call in a new house makes it. Processes that start at the same
 * moment agree, because a partial unique index admits one current key.
 */
export async function currentSigningKey(services: Needs, use: SigningUse): Promise<SigningKeyRow> {
  const found = await readCurrent(services, use);
  if (found) return found;
  const fresh = await makeSigningKey(services, use);
  return await services.write(async (tx) => {
    const [already] = await tx.select().from(signingKey).where(isCurrent(use)).limit(1);
    if (already) return already;
    await tx.insert(signingKey).values(fresh);
    await appendEntries(tx, services.clock.now(), [
      {
        kind: 'signing-key-made',
        actor: SERVICE_ACTOR,
        subjects: [{ kind: 'signing-key', id: fresh.kid }],
        detail: { use, algorithm: fresh.algorithm, publicJwk: JSON.parse(fresh.publicJwk) },
      },
    ]);
    return fresh;
  });
}

/** The private half, opened. */
export async function privateKeyOf(
  services: Pick<Services, 'secrets'>,
  row: SigningKeyRow,
): Promise<CryptoKey> {
  const jwk = JSON.parse(services.secrets.open(row.sealedPrivateJwk, boxContext(row.kid))) as JWK;
  return (await importJWK(jwk, row.algorithm)) as CryptoKey;
}

/** Public halves of every key that still verifies (RFC 7517 key set), for the well-known address. */
export async function publicKeySet(services: Pick<Services, 'read' | 'clock'>): Promise<{ keys: JWK[] }> {
  const rows = await services.read
    .select({ publicJwk: signingKey.publicJwk })
    .from(signingKey)
    .where(
      and(
        // The key of tree heads is published by itself: what trusts this set trusts it for tokens.
        ne(signingKey.use, 'tree-head'),
        isNull(signingKey.compromisedAt),
        or(isNull(signingKey.retiredAt), gt(signingKey.retiredAt, services.clock.now())),
      ),
    );
  return { keys: rows.map((row) => JSON.parse(row.publicJwk) as JWK) };
}

/**
 * A key that may still verify, by its kid; null for unknown and retired ones alike.
 *
 * @returns `distrusted`: somebody else may hold it, so what it signed says nothing of who shows it
 */
export async function verifyingKey(
  services: Pick<Services, 'read' | 'clock'>,
  kid: string,
  use: SigningUse,
): Promise<{ key: CryptoKey; algorithm: SigningKeyRow['algorithm']; distrusted: boolean } | null> {
  const [row] = await services.read
    .select()
    .from(signingKey)
    .where(and(eq(signingKey.kid, kid), eq(signingKey.use, use)))
    .limit(1);
  if (!row) return null;
  const distrusted = row.compromisedAt !== null;
  if (!distrusted && row.retiredAt !== null && row.retiredAt <= services.clock.now()) return null;
  return {
    distrusted,
    key: (await importJWK(JSON.parse(row.publicJwk) as JWK, row.algorithm)) as CryptoKey,
    algorithm: row.algorithm,
  };
}
