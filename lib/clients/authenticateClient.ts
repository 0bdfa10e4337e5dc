import { createHash, timingSafeEqual } from 'node:crypto';
import { eq, lt } from 'drizzle-orm';
import { createLocalJWKSet, decodeJwt, errors, type JSONWebKeySet, jwtVerify } from 'jose';
import { apiClient, proofSeen } from '@/db/schema';
import { isUniqueViolation } from '@/db/write';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { currentPolicy } from '@/lib/policy/currentPolicy';
import { secretHash } from './secretHash';

export type ClientRow = typeof apiClient.$inferSelect;
type Needs = Pick<Services, 'read' | 'write' | 'clock' | 'env'>;

/** Only algorithms with a public key (RFC 8725, 3.1 and 3.2). */
export const ASSERTION_ALGORITHMS = ['ES256', 'EdDSA', 'Ed25519', 'PS256', 'RS256'];
export const ASSERTION_TYPE = 'urn:ietf:params:oauth:client-assertion-type:jwt-bearer';
const LONGEST_ASSERTION_SECONDS = 300;

const refused = (cause: unknown) =>
  new Refusal(
    'client-refused',
    undefined,
    { error: 'invalid_client' },
    { cause, headers: { 'www-authenticate': 'Basic realm="Bellkeep"' } },
  );

const sameHash = (a: string, b: string | null): boolean =>
  b !== null && a.length === b.length && timingSafeEqual(Buffer.from(a), Buffer.from(b));

/** Where a token request carries who asks. */
export interface ClientProof {
  /** The Authorization field. */
  authorization: string | null;
  assertionType: string | undefined;
  assertion: string | undefined;
}

/**
 * Which client asks for a token: by secret (RFC 6749, 2.3.1) or by an assertion signed with a key of its own (RFC 7523,
 * 3). Unknown, revoked and wrong are answered alike.
 *
 * @throws Refusal `client-refused`
 */
export async function authenticateClient(services: Needs, proof: ClientProof): Promise<ClientRow> {
  if (proof.assertion !== undefined) {
    if (proof.authorization !== null || proof.assertionType !== ASSERTION_TYPE)
      throw refused('more than one way to authenticate');
    return await byAssertion(services, proof.assertion);
  }
  return await bySecret(services, proof.authorization ?? '');
}

async function clientOf(services: Needs, id: string): Promise<ClientRow | null> {
  const [row] = await services.read.select().from(apiClient).where(eq(apiClient.id, id)).limit(1);
  return row && row.revokedAt === null ? row : null;
}

async function bySecret(services: Needs, authorization: string): Promise<ClientRow> {
  const [, given] = /^Basic +([A-Za-z0-9+/=]+)$/i.exec(authorization) ?? [];
  const text = Buffer.from(given ?? '', 'base64').toString('utf8');
  const at = text.indexOf(':');
  if (at < 1) throw refused('no client authentication');
  const decoded = (part: string) => {
    try {
      return decodeURIComponent(part.replaceAll('+', ' '));
    } catch {
      return '';
    }
  };
  const row = await clientOf(services, decoded(text.slice(0, at)));
  const hash = secretHash(decoded(text.slice(at + 1)));
  const previous =
    row?.previousEndsAt != null && row.previousEndsAt > services.clock.now() ? row.previousSecretHash : null;
  if (!row || !(sameHash(hash, row.secretHash) || sameHash(hash, previous))) throw refused('secret');
  return row;
}

async function byAssertion(services: Needs, assertion: string): Promise<ClientRow> {
  const { settings } = await currentPolicy(services.read, 'clock');
  const now = services.clock.now();
  try {
    if (assertion.length > 8192) throw refused('too long');
    const row = await clientOf(services, String(decodeJwt(assertion).sub));
    if (!row?.publicKeys) throw refused('no keys');
    const origin = services.env.BELLKEEP_ORIGIN;
    const { payload } = await jwtVerify(
      assertion,
      createLocalJWKSet(row.publicKeys as unknown as JSONWebKeySet),
      {
        algorithms: ASSERTION_ALGORITHMS,
        issuer: row.id,
        subject: row.id,
        audience: [origin, `${origin}/api/v1/token`],
        requiredClaims: ['exp', 'jti'],
        clockTolerance: settings.clientSkewSeconds,
        currentDate: new Date(now),
      },
    );
    const lives = (payload.exp ?? 0) - now / 1000;
    if (lives > LONGEST_ASSERTION_SECONDS + settings.clientSkewSeconds) throw refused('it lives too long');
    await claimAssertion(
      services,
      row.id,
      String(payload.jti),
      (payload.exp ?? 0) * 1000 + settings.clientSkewSeconds * 1000,
    );
    return row;
  } catch (error) {
    if (error instanceof errors.JOSEError || error instanceof TypeError) throw refused(error);
    throw error;
  }
}

/** RFC 7523, 3 (7): an assertion works once. */
async function claimAssertion(
  services: Needs,
  clientId: string,
  jti: string,
  expiresAt: number,
): Promise<void> {
  // Hashed, so that a name of any length has its place.
  const key = `client ${clientId} ${createHash('sha256').update(jti).digest('hex')}`;
  try {
    await services.write(async (tx) => {
      await tx.delete(proofSeen).where(lt(proofSeen.expiresAt, services.clock.now()));
      await tx.insert(proofSeen).values({ key, expiresAt });
    });
  } catch (error) {
    if (isUniqueViolation(error)) throw refused('used before');
    throw error;
  }
}
