import type { CredentialAnswer } from '@/lib/contract/device';
import type { Services } from '@/lib/platform/services';
import { renewAfter } from './issueCredential';
import type { SigningKeyRow } from './signingKeys';
import { type CredentialRow, tokenOf } from './token';

/** What a device gets when it enrols or renews. */
export async function credentialAnswer(
  services: Pick<Services, 'secrets' | 'env' | 'clock'>,
  row: CredentialRow,
  key: SigningKeyRow,
  device: { id: string; assetTag: string },
): Promise<CredentialAnswer> {
  return {
    deviceId: device.id,
    assetTag: device.assetTag,
    credentialId: row.label,
    token: await tokenOf(services, row, key),
    tokenType: row.boundThumbprint ? 'DPoP' : 'Bearer',
    expiresAt: row.expiresAt,
    renewAfter: renewAfter(row),
    serverTime: services.clock.now(),
  };
}
