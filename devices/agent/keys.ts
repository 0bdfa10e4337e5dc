import { type CryptoKey, exportJWK, generateKeyPair, importJWK, type JWK } from 'jose';
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

export async function loadKeys(privateJwk: JWK): Promise<DeviceKeys> {
  const algorithm = privateJwk.kty === 'EC' ? 'ES256' : 'EdDSA';
  return {
    algorithm,
    privateKey: (await importJWK(privateJwk, algorithm)) as CryptoKey,
    publicJwk: publicMembers(privateJwk),
    privateJwk,
  };
}
