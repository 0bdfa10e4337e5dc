import { createHash, randomUUID } from 'node:crypto';
import { CompactSign, SignJWT } from 'jose';
import { ENROLMENT_PROOF_TYPE } from '@/lib/contract/device';
import type { DeviceKeys } from './keys';

/** Proof of possession at enrolment: a JWS over the service, the serial number and the one-time code. */
export async function enrolmentProof(
  keys: DeviceKeys,
  claims: { origin: string; serialNumber: string; code: string; nowMs?: number },
): Promise<string> {
  const payload = {
    aud: claims.origin,
    sub: claims.serialNumber,
    code: claims.code,
    jti: randomUUID(),
    ...(claims.nowMs === undefined ? {} : { iat: Math.floor(claims.nowMs / 1000) }),
  };
  return await new CompactSign(new TextEncoder().encode(JSON.stringify(payload)))
    .setProtectedHeader({ alg: keys.algorithm, typ: ENROLMENT_PROOF_TYPE })
    .sign(keys.privateKey);
}

/** RFC 9449, 4.2: htu is the address of the request without query and fragment. */
function targetOf(url: string): string {
  const target = new URL(url);
  target.search = '';
  target.hash = '';
  return target.href;
}

/** DPoP proof for one request (RFC 9449, 4.2). `nowMs` by the device's own clock. */
export async function dpopProof(
  keys: DeviceKeys,
  request: { method: string; url: string; token: string; nonce: string | null; nowMs: number },
): Promise<string> {
  return await new SignJWT({
    htm: request.method,
    htu: targetOf(request.url),
    ath: createHash('sha256').update(request.token, 'ascii').digest('base64url'),
    ...(request.nonce === null ? {} : { nonce: request.nonce }),
  })
    .setProtectedHeader({ alg: keys.algorithm, typ: 'dpop+jwt', jwk: keys.publicJwk })
    .setJti(randomUUID())
    .setIssuedAt(Math.floor(request.nowMs / 1000))
    .sign(keys.privateKey);
}
