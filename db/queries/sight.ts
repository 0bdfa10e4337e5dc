import { and, eq, gt, inArray, or, type SQL, sql } from 'drizzle-orm';
import { accessReason, device, encounter } from '../schema';

/** Whose eyes a list is for. */
export interface Sight {
  personId: string;
  wardIds: readonly string[];
  /** UTC milliseconds. */
  nowMs: number;
}

export const ofOwnWards = (sight: Sight): SQL => inArray(encounter.wardId, [...sight.wardIds]);

/** Encounters on the person's wards, and those of patients whom a reason that still holds has opened. */
export const inSight = (sight: Sight): SQL =>
  or(
    ofOwnWards(sight),
    sql`${encounter.patientId} in (
      select ${accessReason.patientId} from ${accessReason}
      where ${and(eq(accessReason.personId, sight.personId), gt(accessReason.expiresAt, sight.nowMs))}
    )`,
  ) as SQL;

/** Devices whose stray clips the person may file: those of their wards, and those that belong to none. */
export const trayDevices = (sight: Sight): SQL =>
  or(sql`${device.wardId} is null`, inArray(device.wardId, [...sight.wardIds])) as SQL;
