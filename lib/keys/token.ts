import { decodeProtectedHeader, errors, jwtVerify, SignJWT } from 'jose';
import type { credential } from '@/db/schema';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { privateKeyOf, type SigningKeyRow, verifyingKey } from './signingKeys';

export type CredentialRow = typeof credential.$inferSelect;

/** RFC 9068, 2.1: the explicit type of an access token, so that no other JWT of ours passes for one. */
const TOKEN_TYPE = 'at+jwt';
export const TOKEN_AUDIENCE_PATH = '/api/device/v1';

/**
 * The token of a credential. It is made from the row alone and Ed25519 is deterministic (RFC 8032), so a repeated
 * request gets the same bytes although no token is stored.
 */
export async function tokenOf(
  services: Pick<Services, 'secrets' | 'env'>,
  row: CredentialRow,
  key: SigningKeyRow,
): Promise<string> {
  const origin = services.env.BELLKEEP_ORIGIN;
  return await new SignJWT({
    client_id: row.deviceId,
    ...(row.boundThumbprint ? { cnf: { jkt: row.boundThumbprint } } : {}),
  })
    .setProtectedHeader({ alg: key.algorithm, kid: key.kid, typ: TOKEN_TYPE })
    .setIssuer(origin)
    .setAudience(`${origin}${TOKEN_AUDIENCE_PATH}`)
    .setSubject(row.deviceId)
    .setJti(row.id)
    .setIssuedAt(Math.floor(row.issuedAt / 1000))
    .setExpirationTime(Math.floor(row.expiresAt / 1000))
    .sign(await privateKeyOf(services, key));
}

export interface TokenClaims {
  deviceId: string;
  credentialId: string;
  thumbprint: string | null;
  /** Signed by a key that is trusted no more: only a proof of the device's own key counts. */
  distrusted: boolean;
}

const refused = (cause: unknown) => new Refusal('token-invalid', undefined, {}, { cause });

/**
 * Verify a device token by the rules of RFC 8725: the key by `kid` from our own table and never from the token, one
 * algorithm a key, explicit type, issuer and audience, times by our clock. Every failure has the same answer.
 *
 * @throws Refusal `token-invalid`
 */
export async function verifyToken(
  services: Pick<Services, 'read' | 'clock' | 'env'>,
  token: string,
): Promise<TokenClaims> {
  const origin = services.env.BELLKEEP_ORIGIN;
  try {
    if (token.length > 4096) throw new errors.JWTInvalid('too long');
    const { kid } = decodeProtectedHeader(token);
    const found = typeof kid === 'string' ? await verifyingKey(services, kid, 'device-token') : null;
    if (!found) throw new errors.JWKSNoMatchingKey();
    const { payload } = await jwtVerify(token, found.key, {
      algorithms: [found.algorithm],
      typ: TOKEN_TYPE,
      issuer: origin,
      audience: `${origin}${TOKEN_AUDIENCE_PATH}`,
      requiredClaims: ['iss', 'aud', 'sub', 'jti', 'iat', 'exp'],
      currentDate: new Date(services.clock.now()),
      crit: {},
    });
    const thumbprint = (payload.cnf as { jkt?: unknown } | undefined)?.jkt;
    if (payload.cnf !== undefined && typeof thumbprint !== 'string')
      throw new errors.JWTInvalid('cnf without jkt');
    return {
      deviceId: String(payload.sub),
      credentialId: String(payload.jti),
      thumbprint: typeof thumbprint === 'string' ? thumbprint : null,
      distrusted: found.distrusted,
    };
  } catch (cause) {
    if (cause instanceof errors.JOSEError || cause instanceof TypeError || cause instanceof SyntaxError)
      throw refused(cause);
    throw cause;
  }
}
