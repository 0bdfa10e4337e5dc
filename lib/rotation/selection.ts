import { and, asc, eq, gt, inArray, isNull, lt, notInArray, type SQL } from 'drizzle-orm';
import { z } from 'zod';
import type { Reader } from '@/db/client';
import { credential, device, RotationSelection, rotationMember, rotationRun } from '@/db/schema';
import type { Tx } from '@/db/write';

/** A thousand devices is a hospital; ten thousand a mistake, or a region that starts one run a house. */
export const MOST_MEMBERS = 10_000;

export const Selection = RotationSelection.extend({
  wardId: z.string().max(64).nullable().default(null),
  modelId: z.string().max(64).nullable().default(null),
  firmware: z.string().max(64).nullable().default(null),
  endingBefore: z.number().int().nullable().default(null),
});

/** Credentials that are under way in another run are not taken into a second one. */
const busy = (read: Reader | Tx) =>
  read
    .select({ id: rotationMember.credentialId })
    .from(rotationMember)
    .innerJoin(rotationRun, eq(rotationRun.id, rotationMember.runId))
    .where(
      and(
        inArray(rotationRun.state, ['running', 'paused']),
        inArray(rotationMember.state, ['waiting', 'asked']),
      ),
    );

function chosen(read: Reader | Tx, selection: RotationSelection, now: number): SQL | undefined {
  return and(
    inArray(credential.state, ['issued', 'in-use']),
    gt(credential.expiresAt, now),
    isNull(credential.successorId),
    selection.wardId === null ? undefined : eq(device.wardId, selection.wardId),
    selection.modelId === null ? undefined : eq(device.modelId, selection.modelId),
    selection.firmware === null ? undefined : eq(device.firmware, selection.firmware),
    selection.endingBefore === null ? undefined : lt(credential.expiresAt, selection.endingBefore),
    notInArray(credential.id, busy(read)),
  );
}

/**
 * The living, last credentials of a selection, in the order of their devices' tags.
 *
 * @returns at most MOST_MEMBERS + 1
 */
export async function credentialsOf(
  read: Reader | Tx,
  selection: RotationSelection,
  now: number,
): Promise<{ credentialId: string; deviceId: string }[]> {
  return await read
    .select({ credentialId: credential.id, deviceId: credential.deviceId })
    .from(credential)
    .innerJoin(device, eq(device.id, credential.deviceId))
    .where(chosen(read, selection, now))
    .orderBy(asc(device.assetTag))
    .limit(MOST_MEMBERS + 1);
}
