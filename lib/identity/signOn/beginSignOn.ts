import { createHash } from 'node:crypto';
import { readConnection } from '@/lib/platform/connectionSetting';
import { Refusal } from '@/lib/platform/errors';
import { newSecret } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';
import { keepAttempt } from '../signInAttempt';
import { discover } from './discovery';

export const CALLBACK_PATH = '/api/auth/single-sign-on/callback';
/** The field in which the browser holds its way through the provider. */
export const SIGN_ON_COOKIE = 'bellkeep.sign_on';

export const signOnCookie = ({ env }: Pick<Services, 'env'>, value: string, seconds: number): string =>
  [
    `${SIGN_ON_COOKIE}=${value}`,
    'Path=/api/auth/single-sign-on',
    `Max-Age=${seconds}`,
    'HttpOnly',
    'SameSite=Lax',
    ...(env.BELLKEEP_ORIGIN.startsWith('https:') ? ['Secure'] : []),
  ].join('; ');

/**
 * Send a browser to the hospital's provider: authorization code with PKCE (RFC 7636), state and nonce, all bound to
 * this browser by a cookie.
 *
 * @param next address of ours to lead to afterwards, checked by the caller
 * @throws Refusal `not-found` where single sign-on is not set up; OutsideError
 */
export async function beginSignOn(
  services: Pick<Services, 'read' | 'write' | 'clock' | 'env' | 'secrets'>,
  next: string,
): Promise<{ address: string; cookie: string }> {
  const found = await readConnection(services, 'single-sign-on');
  if (!found) throw new Refusal('not-found');
  const { issuer, clientId } = found.settings;
  const provider = await discover(services.env, issuer);
  const [state, nonce, verifier] = [newSecret(), newSecret(), newSecret()];
  const handle = await keepAttempt(services, 'single-sign-on', { state, nonce, verifier, issuer, next });
  const address = new URL(provider.authorization_endpoint);
  for (const [name, value] of Object.entries({
    response_type: 'code',
    client_id: clientId,
    redirect_uri: services.env.BELLKEEP_ORIGIN + CALLBACK_PATH,
    scope: 'openid email profile',
    state,
    nonce,
    code_challenge: createHash('sha256').update(verifier).digest('base64url'),
    code_challenge_method: 'S256',
  }))
    address.searchParams.set(name, value);
  return { address: address.href, cookie: signOnCookie(services, handle, 600) };
}
