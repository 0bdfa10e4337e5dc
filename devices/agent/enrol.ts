import { CredentialAnswer, type EnrolRequest } from '@/lib/contract/device';
import { understood } from './answers';
import type { Device } from './device';
import { enrolmentProof } from './proofs';
import { withRetry } from './retry';

/**
 * Exchange the one-time code of the enrolment sheet for the first credential. Safe to repeat with the same code.
 *
 * @throws ServiceProblem `enrolment-refused`; NoAnswer
 */
export async function enrol(device: Device, code: string, firmware?: string): Promise<CredentialAnswer> {
  const plain = code.toUpperCase().replace(/[\s-]/g, '');
  const request: EnrolRequest = {
    code: plain,
    serialNumber: device.serialNumber,
    publicKey: device.keys.publicJwk,
    proof: await enrolmentProof(device.keys, {
      origin: device.origin,
      serialNumber: device.serialNumber,
      code: plain,
      nowMs: device.clock.now(),
    }),
    ...(firmware === undefined ? {} : { firmware }),
  };
  const answer = await withRetry(device, async () =>
    understood(CredentialAnswer, await device.api.call('/api/device/v1/enrol', request)),
  );
  await device.adoptCredential(answer);
  return answer;
}
