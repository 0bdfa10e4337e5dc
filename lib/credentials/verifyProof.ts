import { createHash } from 'node:crypto';
import { calculateJwkThumbprint, decodeProtectedHeader, EmbeddedJWK, errors, jwtVerify } from 'jose';
import { PublicJwk } from '@/lib/contract/device';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { isFreshNonce } from './nonce';

export interface ProofFor {
  proof: string;
  method: string;
  /** The address without query and fragment, as devices see it. */
  url: string;
  token: string;
  thumbprint: string;
}

const invalid = (cause: string | Error) => new Refusal('proof-invalid', undefined, {}, { cause });

/**
 * Verify a DPoP proof (RFC 9449, 4.3): signed by the key the token is bound to, for this method and address, over
 * this token, with a nonce of ours. The key in the header is used only after its thumbprint equals the token's, so
 * it is the token that chooses the key. `iat` is not judged: the nonce bounds the proof's age, and a device's clock
 * may be years off (section 8).
 *
 * @returns the proof's jti, to be remembered against replay
 * @throws Refusal `proof-invalid`, `use-dpop-nonce`
 */
export async function verifyProof(
  services: Pick<Services, 'env' | 'clock'>,
  expected: ProofFor,
): Promise<string> {
  let nonce: unknown;
  let jti: string;
  try {
    if (expected.proof.length > 4096) throw invalid('too long');
    const header = decodeProtectedHeader(expected.proof);
    const jwk = PublicJwk.safeParse(publicMembers(header.jwk));
    if (!jwk.success || Object.keys(header.jwk ?? {}).includes('d'))
      throw invalid('key in header is not a public key of ours');
    if ((await calculateJwkThumbprint(jwk.data, 'sha256')) !== expected.thumbprint)
      throw invalid('another key');
    const algorithms = jwk.data.kty === 'OKP' ? ['EdDSA', 'Ed25519'] : ['ES256'];
    const { payload } = await jwtVerify(expected.proof, EmbeddedJWK, {
      algorithms,
      typ: 'dpop+jwt',
      requiredClaims: ['jti', 'htm', 'htu', 'iat', 'ath'],
      // Not our clock against theirs: any exp or nbf a device adds is judged by the nonce window instead.
      clockTolerance: Number.MAX_SAFE_INTEGER,
    });
    if (payload.htm !== expected.method) throw invalid('htm');
    if (!sameAddress(payload.htu, expected.url)) throw invalid('htu');
    if (payload.ath !== createHash('sha256').update(expected.token, 'ascii').digest('base64url'))
      throw invalid('ath');
    if (typeof payload.jti !== 'string' || payload.jti.length < 8 || payload.jti.length > 200)
      throw invalid('jti');
    nonce = payload.nonce;
    jti = payload.jti;
  } catch (cause) {
    if (
      cause instanceof errors.JOSEError ||
      cause instanceof TypeError ||
      cause instanceof SyntaxError ||
      cause instanceof DOMException
    ) {
      throw invalid(cause);
    }
    throw cause;
  }
  if (!isFreshNonce(services, nonce)) {
    throw new Refusal(
      'use-dpop-nonce',
      undefined,
      {},
      {
        // The nonce itself stands in every answer of the device API; twice in one it would be no nonce.
        headers: { 'www-authenticate': 'DPoP error="use_dpop_nonce"' },
      },
    );
  }
  return jti;
}

/** A device may say alg, kid or use beside its key; what matters are the members of its type. */
function publicMembers(jwk: unknown): unknown {
  if (typeof jwk !== 'object' || jwk === null) return jwk;
  const { kty, crv, x, y } = jwk as Record<string, unknown>;
  return kty === 'EC' ? { kty, crv, x, y } : { kty, crv, x };
}

/** RFC 9449, 4.3 (9): equal after scheme- and syntax-based normalisation, without query and fragment. */
function sameAddress(given: unknown, expected: string): boolean {
  if (typeof given !== 'string' || !URL.canParse(given)) return false;
  const url = new URL(given);
  url.search = '';
  url.hash = '';
  return url.href === new URL(expected).href;
}
