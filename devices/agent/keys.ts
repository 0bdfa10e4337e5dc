import {
  type CryptoKey,
  calculateJwkThumbprint,
  exportJWK,
  generateKeyPair,
  importJWK,
  type JWK,
} from 'jose';
import type { PublicJwk } from '@/lib/contract/device';

export type KeyType = 'Ed25519' | 'P-256';

/** The device's key pair. The private half never leaves the device. */
export interface DeviceKeys {
  algorithm: 'EdDSA' | 'ES256';
  privateKey: CryptoKey;
  publicJwk: PublicJwk;
  /** For the state folder only. */
  privateJwk: JWK;
}

const publicMembers = ({ kty, crv, x, y }: JWK): PublicJwk =>
  (kty === 'EC' ? { kty, crv, x, y } : { kty, crv, x }) as PublicJwk;

/** A fresh pair: Ed25519 (RFC 8037), or P-256 (RFC 7518, 6.2) for hardware that has nothing else. */
export async function makeKeys(type: KeyType = 'Ed25519'): Promise<DeviceKeys> {
  const algorithm = type === 'Ed25519' ? 'EdDSA' : 'ES256';
  const pair = await generateKeyPair(algorithm, {
    extractable: true,
    ...(type === 'Ed25519' ? { crv: 'Ed25519' } : {}),
  });
  return {
    algorithm,
    privateKey: pair.privateKey,
    publicJwk: publicMembers(await exportJWK(pair.publicKey)),
    privateJwk: await exportJWK(pair.privateKey),
  };
}

/** The pair of a private JWK, as the state folder holds it. */
export async function loadKeys(privateJwk: JWK): Promise<DeviceKeys> {
  const algorithm = privateJwk.kty === 'EC' ? 'ES256' : 'EdDSA';
  return {
    algorithm,
    privateKey: (await importJWK(privateJwk, algorithm)) as CryptoKey,
    publicJwk: publicMembers(privateJwk),
    privateJwk,
  };
}

/** RFC 7638 SHA-256 thumbprint, base64url: what the engineer compares at the bench. */
export const thumbprintOf = (key: PublicJwk): Promise<string> => calculateJwkThumbprint(key, 'sha256');
