import { createLocalJWKSet, type JSONWebKeySet } from 'jose';
import { z } from 'zod';
import type { Env } from '@/lib/platform/env';
import { OutsideError, outsideJson } from '@/lib/platform/outside';

/** As much of OpenID Connect Discovery 1.0, 3 as is used. */
const Metadata = z.looseObject({
  issuer: z.string(),
  authorization_endpoint: z.url(),
  token_endpoint: z.url(),
  jwks_uri: z.url(),
  userinfo_endpoint: z.url().optional(),
  authorization_response_iss_parameter_supported: z.boolean().optional(),
});
export type ProviderMetadata = z.infer<typeof Metadata>;

/**
 * What the provider says of itself. Asked each time: sign-in is rare, and a provider that was changed must not be
 * believed by yesterday's answer.
 *
 * @throws OutsideError when it does not answer, or names itself otherwise (OpenID Connect Discovery 1.0, 4.3)
 */
export async function discover(env: Env, issuer: string): Promise<ProviderMetadata> {
  const parsed = Metadata.safeParse(await outsideJson(env, `${issuer}/.well-known/openid-configuration`));
  if (!parsed.success) throw new OutsideError('no-answer', 'The provider does not say its addresses.');
  if (parsed.data.issuer.replace(/\/+$/, '') !== issuer)
    throw new OutsideError('no-answer', 'The provider names itself otherwise than it is set here.');
  return parsed.data;
}

/** The provider's keys of this moment, as jose looks them up. */
export async function providerKeys(env: Env, provider: ProviderMetadata) {
  return createLocalJWKSet((await outsideJson(env, provider.jwks_uri)) as unknown as JSONWebKeySet);
}
