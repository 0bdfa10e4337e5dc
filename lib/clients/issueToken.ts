import { eq } from 'drizzle-orm';
import { SignJWT } from 'jose';
import { z } from 'zod';
import { apiClient } from '@/db/schema';
import { SCOPE_NAMES, type Scope } from '@/lib/contract/scopes';
import { currentSigningKey, privateKeyOf } from '@/lib/keys/signingKeys';
import { Refusal } from '@/lib/platform/errors';
import { newId } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';
import { authenticateClient, type ClientProof } from './authenticateClient';

export const TOKEN_SECONDS = 600;
export const CLIENT_AUDIENCE_PATH = '/api/v1';

export const TokenRequest = z.object({
  grant_type: z.string(),
  scope: z.string().max(500).optional(),
  client_assertion_type: z.string().optional(),
  client_assertion: z.string().optional(),
});

export interface TokenAnswer {
  access_token: string;
  token_type: 'Bearer';
  expires_in: number;
  scope: string;
}

/** The scopes of a token: all that the client has, or as many of them as it asks for (RFC 6749, 3.3). */
function scopesOf(held: readonly string[], asked: string | undefined): Scope[] {
  const mine = SCOPE_NAMES.filter((scope) => held.includes(scope));
  if (asked === undefined) return mine;
  const wanted = asked.split(' ').filter(Boolean);
  if (wanted.length === 0 || !wanted.every((scope) => (mine as string[]).includes(scope)))
    throw new Refusal('scope-refused', undefined, { error: 'invalid_scope' });
  return mine.filter((scope) => wanted.includes(scope));
}

/**
 * A short access token for another system (RFC 6749, 4.4; RFC 9068). It is not stored: what counts at each call is
 * whether its client is still allowed.
 *
 * @throws Refusal `client-refused`, `grant-refused`, `scope-refused`
 */
export async function issueToken(
  services: Pick<Services, 'read' | 'write' | 'clock' | 'env' | 'secrets'>,
  authorization: string | null,
  request: z.infer<typeof TokenRequest>,
): Promise<TokenAnswer> {
  if (request.grant_type !== 'client_credentials')
    throw new Refusal('grant-refused', undefined, { error: 'unsupported_grant_type' });
  const proof: ClientProof = {
    authorization,
    assertionType: request.client_assertion_type,
    assertion: request.client_assertion,
  };
  const client = await authenticateClient(services, proof);
  const scope = scopesOf(client.scopes, request.scope).join(' ');
  const key = await currentSigningKey(services, 'client-token');
  const now = services.clock.now();
  const origin = services.env.BELLKEEP_ORIGIN;
  const token = await new SignJWT({ client_id: client.id, scope })
    .setProtectedHeader({ alg: key.algorithm, kid: key.kid, typ: 'at+jwt' })
    .setIssuer(origin)
    .setAudience(`${origin}${CLIENT_AUDIENCE_PATH}`)
    .setSubject(client.id)
    .setJti(newId())
    .setIssuedAt(Math.floor(now / 1000))
    .setExpirationTime(Math.floor(now / 1000) + TOKEN_SECONDS)
    .sign(await privateKeyOf(services, key));
  await services.write(async (tx) => {
    await tx.update(apiClient).set({ lastUsedAt: now }).where(eq(apiClient.id, client.id));
  });
  return { access_token: token, token_type: 'Bearer', expires_in: TOKEN_SECONDS, scope };
}
