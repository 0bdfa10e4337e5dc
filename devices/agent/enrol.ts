import { CredentialAnswer, type EnrolRequest } from '@/lib/contract/device';
import type { Device } from './device';
import { enrolmentProof } from './proofs';
import { withRetry } from './retry';

/** Exchange the one-time code of the enrolment sheet for the first credential. Safe to repeat with the same code. */
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
    }),
    ...(firmware === undefined ? {} : { firmware }),
  };
  const answer = CredentialAnswer.parse(
    await withRetry(device, () => device.api.call('/api/device/v1/enrol', request)),
  );
  await device.keepCredential(answer);
  return answer;
}

/** Renew the credential. The new one is stored before it is used; a lost answer is asked for again with the old one. */
export async function renew(device: Device): Promise<CredentialAnswer> {
  const answer = CredentialAnswer.parse(
    await withRetry(device, () => device.call('/api/device/v1/token', {})),
  );
  await device.keepCredential(answer);
  return answer;
}
