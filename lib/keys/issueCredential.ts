import { credential } from '@/db/schema';
import type { Tx } from '@/db/write';
import { newId, readableCode } from '@/lib/platform/ids';
import { currentPolicy } from '@/lib/policy/currentPolicy';
import type { CredentialRow } from './token';

const DAY_MS = 86_400_000;
/** How long before its end a credential of before there was a policy is renewed. */
const RENEW_BEFORE_END_MS = 21 * DAY_MS;
const BEARER_RENEW_BEFORE_END_MS = 5 * DAY_MS;

export interface CredentialFor {
  deviceId: string;
  kid: string;
  boundThumbprint: string | null;
  nowMs: number;
  predecessor?: CredentialRow;
}

/** Write a new credential's row, with the lifetime that policy gives it; the caller writes the custody entry that says why, in the same transaction. */
export async function insertCredential(tx: Tx, wanted: CredentialFor): Promise<CredentialRow> {
  const code = readableCode(6);
  const { settings } = await currentPolicy(tx, 'credentials');
  const [lifetimeDays, renewBeforeDays] = wanted.boundThumbprint
    ? [settings.boundLifetimeDays, settings.boundRenewBeforeDays]
    : [settings.bearerLifetimeDays, settings.bearerRenewBeforeDays];
  const expiresAt = wanted.nowMs + lifetimeDays * DAY_MS;
  const row: CredentialRow = {
    id: newId(),
    label: `c-${code.slice(0, 4)}-${code.slice(4)}`,
    familyId: wanted.predecessor?.familyId ?? newId(),
    deviceId: wanted.deviceId,
    kid: wanted.kid,
    boundThumbprint: wanted.boundThumbprint,
    state: 'issued',
    issuedAt: wanted.nowMs,
    expiresAt,
    firstUsedAt: null,
    lastUsedAt: null,
    overlapEndsAt: null,
    successorId: null,
    predecessorId: wanted.predecessor?.id ?? null,
    renewAfter: expiresAt - renewBeforeDays * DAY_MS,
    renewalAskedAt: null,
    revokedAt: null,
    endReason: null,
    version: 1,
  };
  await tx.insert(credential).values(row);
  return row;
}

/** From when on the device should renew, UTC ms. */
export const renewAfter = (
  row: Pick<CredentialRow, 'expiresAt' | 'boundThumbprint' | 'renewAfter'>,
): number =>
  row.renewAfter ?? row.expiresAt - (row.boundThumbprint ? RENEW_BEFORE_END_MS : BEARER_RENEW_BEFORE_END_MS);

export const shouldRenew = (row: CredentialRow, nowMs: number): boolean =>
  row.renewalAskedAt !== null || nowMs >= renewAfter(row);
