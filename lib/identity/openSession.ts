import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { authOf, PEER_FIELD } from './auth';
import type { Peer } from './callAuth';
import type { SignInStep } from './signIn';

/**
 * Sign somebody in who was recognised by a passkey or by the hospital's provider. Never call it inside a `write`.
 *
 * @param secondFactorPassed what they came by counts as a second factor
 * @throws Refusal `sign-in-refused` for somebody who left
 */
export async function openSession(
  services: Pick<Services, 'database' | 'read' | 'env' | 'log'>,
  peer: Peer,
  personId: string,
  secondFactorPassed: boolean,
): Promise<SignInStep> {
  const { headers, response } = await authOf(services).api.openSession({
    body: { personId, secondFactorPassed },
    headers: new Headers({
      [PEER_FIELD]: peer.address,
      'user-agent': peer.headers.get('user-agent') ?? '',
    }),
    returnHeaders: true,
  });
  if (response.next === 'refused') throw new Refusal('sign-in-refused');
  return { next: response.next, cookies: headers.getSetCookie() };
}
