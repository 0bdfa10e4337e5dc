import { and, asc, desc, eq, inArray, isNull, sql } from 'drizzle-orm';
import { device, deviceModel, listeningSession } from '@/db/schema';
import type { Authorized } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';

/** Devices in service for a listening session: the person's wards first, those heard from lately before the others. */
export async function pickDevices(
  services: Pick<Services, 'read'>,
  by: Authorized<'session.write'>,
  q: string,
) {
  const pattern = `%${q.replace(/[\\%_]/g, (c) => `\\${c}`)}%`;
  const own = by.wardIds.length > 0 ? inArray(device.wardId, [...by.wardIds]) : sql`1 = 0`;
  return await services.read
    .select({
      id: device.id,
      assetTag: device.assetTag,
      serialNumber: device.serialNumber,
      model: deviceModel.name,
      lastHeardAt: device.lastHeardAt,
      batteryPercent: device.batteryPercent,
      checkDueAt: device.checkDueAt,
      inSession: listeningSession.number,
    })
    .from(device)
    .innerJoin(deviceModel, eq(deviceModel.id, device.modelId))
    .leftJoin(
      listeningSession,
      and(eq(listeningSession.deviceId, device.id), isNull(listeningSession.closedAt)),
    )
    .where(
      and(
        eq(device.state, 'in-service'),
        q === ''
          ? own
          : sql`(${device.assetTag} like ${pattern} escape '\\' or ${device.serialNumber} like ${pattern} escape '\\' or ${device.udi} = ${q})`,
      ),
    )
    .orderBy(desc(sql`${own}`), desc(device.lastHeardAt), asc(device.assetTag))
    .limit(12);
}
