import { credential } from '@/db/schema';
import type { Tx } from '@/db/write';
import { newId, readableCode } from '@/lib/platform/ids';
import type { CredentialRow } from './token';

const DAY_MS = 86_400_000;
/** How long a credential lives, and how long before its end a device is told to renew. Hospital policy may shorten it. */
export const CREDENTIAL_LIFETIME_MS = 90 * DAY_MS;
export const RENEW_BEFORE_END_MS = 21 * DAY_MS;
/** Plain bearer credentials live shorter: whoever copies one has all of it. */
export const BEARER_LIFETIME_MS = 14 * DAY_MS;
export const BEARER_RENEW_BEFORE_END_MS = 5 * DAY_MS;

export interface CredentialFor {
  deviceId: string;
  kid: string;
  boundThumbprint: string | null;
  nowMs: number;
  predecessor?: CredentialRow;
}

/** Write a new credential's row; the caller writes the custody entry that says why, in the same transaction. */
export async function insertCredential(tx: Tx, wanted: CredentialFor): Promise<CredentialRow> {
  const code = readableCode(6);
  const row: CredentialRow = {
    id: newId(),
    label: `c-${code.slice(0, 4)}-${code.slice(4)}`,
    familyId: wanted.predecessor?.familyId ?? newId(),
    deviceId: wanted.deviceId,
    kid: wanted.kid,
    boundThumbprint: wanted.boundThumbprint,
    state: 'issued',
    issuedAt: wanted.nowMs,
    expiresAt: wanted.nowMs + (wanted.boundThumbprint ? CREDENTIAL_LIFETIME_MS : BEARER_LIFETIME_MS),
    firstUsedAt: null,
    lastUsedAt: null,
    overlapEndsAt: null,
    successorId: null,
    predecessorId: wanted.predecessor?.id ?? null,
    renewAfter: null,
    renewalAskedAt: null,
    revokedAt: null,
    endReason: null,
    version: 1,
  };
  await tx.insert(credential).values(row);
  return row;
}

/** From when on the device should renew, UTC ms. */
export const renewAfter = (row: Pick<CredentialRow, 'expiresAt' | 'boundThumbprint'>): number =>
  row.expiresAt - (row.boundThumbprint ? RENEW_BEFORE_END_MS : BEARER_RENEW_BEFORE_END_MS);

export const shouldRenew = (row: CredentialRow, nowMs: number): boolean =>
  row.renewalAskedAt !== null || nowMs >= renewAfter(row);
