import { eq } from 'drizzle-orm';
import { decodeProtectedHeader, errors, jwtVerify } from 'jose';
import { apiClient } from '@/db/schema';
import type { Scope } from '@/lib/contract/scopes';
import { verifyingKey } from '@/lib/keys/signingKeys';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { CLIENT_AUDIENCE_PATH } from './issueToken';

declare const authorized: unique symbol;
/** Another system whose token, standing and scope were checked in this request. */
export interface AuthorizedClient<S extends Scope = Scope> {
  readonly [authorized]: S;
  id: string;
  name: string;
}

const refused = (cause: unknown) =>
  new Refusal(
    'access-token-refused',
    undefined,
    {},
    { cause, headers: { 'www-authenticate': 'Bearer error="invalid_token"' } },
  );

/**
 * Who calls, and whether the token allows it (RFC 9068, 4; RFC 6750, 3.1). Keys come from our own table and never from
 * the token (RFC 8725, 3.10).
 *
 * @throws Refusal `access-token-refused`, `scope-missing`
 */
export async function authorizeClient<S extends Scope>(
  services: Pick<Services, 'read' | 'clock' | 'env'>,
  authorization: string | null,
  scope: S,
): Promise<AuthorizedClient<S>> {
  const [, token] = /^Bearer +([\w.~+/=-]+)$/i.exec(authorization ?? '') ?? [];
  if (!token || token.length > 4096) throw refused('no token');
  const { sub, scopes } = await readToken(services, token);
  const [row] = await services.read.select().from(apiClient).where(eq(apiClient.id, sub)).limit(1);
  if (!row || row.revokedAt !== null) throw refused('revoked');
  if (!scopes.includes(scope) || !row.scopes.includes(scope))
    throw new Refusal(
      'scope-missing',
      `This needs the scope ${scope}.`,
      {},
      { headers: { 'www-authenticate': `Bearer error="insufficient_scope", scope="${scope}"` } },
    );
  return { id: row.id, name: row.name } as AuthorizedClient<S>;
}

async function readToken(
  services: Pick<Services, 'read' | 'clock' | 'env'>,
  token: string,
): Promise<{ sub: string; scopes: string[] }> {
  const origin = services.env.BELLKEEP_ORIGIN;
  try {
    const { kid } = decodeProtectedHeader(token);
    const found = typeof kid === 'string' ? await verifyingKey(services, kid, 'client-token') : null;
    if (!found || found.distrusted) throw new errors.JWKSNoMatchingKey();
    const { payload } = await jwtVerify(token, found.key, {
      algorithms: [found.algorithm],
      typ: 'at+jwt',
      issuer: origin,
      audience: `${origin}${CLIENT_AUDIENCE_PATH}`,
      requiredClaims: ['sub', 'exp', 'iat', 'jti'],
      currentDate: new Date(services.clock.now()),
    });
    return { sub: String(payload.sub), scopes: String(payload.scope ?? '').split(' ') };
  } catch (error) {
    if (error instanceof errors.JOSEError || error instanceof TypeError || error instanceof SyntaxError)
      throw refused(error);
    throw error;
  }
}
