import { calculateJwkThumbprint, compactVerify, errors, importJWK } from 'jose';
import { ENROLMENT_PROOF_TYPE, type PublicJwk } from '@/lib/contract/device';

/**
 * Whether the enrolling device holds the private half of the key it posts: a JWS over this service, this serial
 * number and this code. Freshness comes from the one-time code, so a device clock that is years off does no harm.
 *
 * @returns RFC 7638 SHA-256 thumbprint of the key, or null when the proof is not right
 */
export async function verifyEnrolmentProof(
  proof: string,
  expected: { publicKey: PublicJwk; origin: string; serialNumber: string; code: string },
): Promise<string | null> {
  const algorithm = expected.publicKey.kty === 'OKP' ? 'EdDSA' : 'ES256';
  try {
    const key = await importJWK(expected.publicKey, algorithm);
    const { payload, protectedHeader } = await compactVerify(proof, key, {
      algorithms: [algorithm, ...(algorithm === 'EdDSA' ? ['Ed25519'] : [])],
    });
    if (protectedHeader.typ !== ENROLMENT_PROOF_TYPE) return null;
    const claims = JSON.parse(new TextDecoder().decode(payload)) as Record<string, unknown>;
    const right =
      claims.aud === expected.origin &&
      claims.sub === expected.serialNumber &&
      typeof claims.code === 'string' &&
      claims.code.toUpperCase().replace(/[\s-]/g, '') === expected.code;
    return right ? await calculateJwkThumbprint(expected.publicKey, 'sha256') : null;
  } catch (error) {
    if (
      error instanceof errors.JOSEError ||
      error instanceof TypeError ||
      error instanceof SyntaxError ||
      error instanceof DOMException
    )
      return null;
    throw error;
  }
}
