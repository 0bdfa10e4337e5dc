import { type JWTPayload, jwtVerify } from 'jose';
import type { ConnectionSettings } from '@/lib/platform/connectionSetting';
import { callOutside, OutsideError, outsideJson } from '@/lib/platform/outside';
import type { Services } from '@/lib/platform/services';
import { CALLBACK_PATH } from './beginSignOn';
import { type ProviderMetadata, providerKeys } from './discovery';

/** Only algorithms with a public key: a client secret must not sign who somebody is. */
const ALGORITHMS = [
  'RS256',
  'PS256',
  'ES256',
  'ES384',
  'EdDSA',
  'Ed25519',
  'RS384',
  'RS512',
  'PS384',
  'PS512',
];
const SKEW_SECONDS = 60;

export interface ProvenIdentity {
  issuer: string;
  subject: string;
  /** Lower case; null unless the provider says that it was verified. */
  email: string | null;
  /** The provider says that it asked for a second factor (RFC 8176, `mfa`). */
  secondFactor: boolean;
}

interface Exchange {
  settings: ConnectionSettings<'single-sign-on'>;
  secret: string | null;
  provider: ProviderMetadata;
  code: string;
  verifier: string;
  nonce: string;
}

/**
 * Exchange the code and read who it is: the ID token's signature, issuer, audience, times and nonce are checked
 * (OpenID Connect Core 1.0, 3.1.3.7). Nothing else that it says is used: roles are given here.
 *
 * @throws OutsideError; errors of jose
 */
export async function readIdentity(
  services: Pick<Services, 'env' | 'clock'>,
  exchange: Exchange,
): Promise<ProvenIdentity> {
  const { settings, provider } = exchange;
  const tokens = await redeem(services, exchange);
  const { payload } = await jwtVerify(String(tokens.id_token), await providerKeys(services.env, provider), {
    algorithms: ALGORITHMS,
    issuer: provider.issuer,
    audience: settings.clientId,
    requiredClaims: ['sub', 'exp', 'iat', 'nonce'],
    clockTolerance: SKEW_SECONDS,
    currentDate: new Date(services.clock.now()),
  });
  if (payload.nonce !== exchange.nonce) throw new OutsideError('no-answer', 'The nonce is another one.');
  const parties = [payload.aud ?? []].flat();
  if ((parties.length > 1 || payload.azp !== undefined) && payload.azp !== settings.clientId)
    throw new OutsideError('no-answer', 'The token was made for somebody else.');
  const claims = await withEmail(services, provider, payload, tokens.access_token);
  const verified = claims.email_verified === true && typeof claims.email === 'string';
  return {
    issuer: provider.issuer,
    subject: String(payload.sub),
    email: verified ? String(claims.email).trim().toLowerCase() : null,
    secondFactor: Array.isArray(payload.amr) && payload.amr.includes('mfa'),
  };
}

/** RFC 6749, 4.1.3; client authentication by HTTP Basic with the form encoding of 2.3.1. */
async function redeem(
  services: Pick<Services, 'env'>,
  { settings, secret, provider, code, verifier }: Exchange,
): Promise<Record<string, unknown>> {
  const form = new URLSearchParams({
    grant_type: 'authorization_code',
    code,
    redirect_uri: services.env.BELLKEEP_ORIGIN + CALLBACK_PATH,
    code_verifier: verifier,
    ...(secret === null ? { client_id: settings.clientId } : {}),
  });
  const encoded = (text: string) => new URLSearchParams({ v: text }).toString().slice(2);
  const answer = await callOutside(services.env, provider.token_endpoint, {
    method: 'POST',
    headers: {
      'content-type': 'application/x-www-form-urlencoded',
      accept: 'application/json',
      ...(secret === null
        ? {}
        : {
            authorization: `Basic ${Buffer.from(`${encoded(settings.clientId)}:${encoded(secret)}`).toString('base64')}`,
          }),
    },
    body: form.toString(),
  });
  if (answer.status !== 200) throw new OutsideError('no-answer', `The code was answered ${answer.status}.`);
  const tokens = JSON.parse(answer.body) as Record<string, unknown>;
  if (typeof tokens.id_token !== 'string') throw new OutsideError('no-answer', 'There is no ID token.');
  return tokens;
}

/** Some providers tell the address only at their userinfo endpoint; its subject must be the token's (5.3.2). */
async function withEmail(
  services: Pick<Services, 'env'>,
  provider: ProviderMetadata,
  payload: JWTPayload,
  accessToken: unknown,
): Promise<Record<string, unknown>> {
  if (payload.email !== undefined || !provider.userinfo_endpoint || typeof accessToken !== 'string')
    return payload;
  const told = await outsideJson(services.env, provider.userinfo_endpoint, {
    headers: { authorization: `Bearer ${accessToken}` },
  });
  if (told.sub !== payload.sub) throw new OutsideError('no-answer', 'The provider tells of somebody else.');
  return told;
}
