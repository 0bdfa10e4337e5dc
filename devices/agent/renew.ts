import { CredentialAnswer } from '@/lib/contract/device';
import { understood } from './answers';
import { type Device, RENEW_PATH } from './device';
import { withRetry } from './retry';

/**
 * Renew the credential. The new one is stored before it is used; a lost answer is asked for again with the old one,
 * which the service answers with the same successor.
 *
 * @throws ServiceProblem, NoAnswer; the old credential still stands then
 */
export async function renew(device: Device): Promise<CredentialAnswer> {
  const answer = await withRetry(device, async () =>
    understood(CredentialAnswer, await device.call(RENEW_PATH, {})),
  );
  await device.keepCredential(answer);
  return answer;
}
