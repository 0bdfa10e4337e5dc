import { and, asc, desc, eq, gt, inArray, isNull, or, sql } from 'drizzle-orm';
import { credential, device, deviceModel, enrolmentCode, firmwareChange, recording, ward } from '@/db/schema';
import type { Authorized } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';
import { noiseFloors } from './readFleet';

/** One device with everything its page shows; null when there is none. */
export async function readDevice(
  services: Pick<Services, 'read' | 'clock'>,
  _by: Authorized<'device.read'>,
  idOrTag: string,
) {
  const { read } = services;
  const now = services.clock.now();
  const [row] = await read
    .select({ device, model: deviceModel, ward: ward.name })
    .from(device)
    .innerJoin(deviceModel, eq(deviceModel.id, device.modelId))
    .leftJoin(ward, eq(ward.id, device.wardId))
    .where(sql`(${device.id} = ${idOrTag} or ${device.assetTag} = ${idOrTag})`)
    .limit(1);
  if (!row) return null;
  const id = row.device.id;
  const [credentials, code, clips, firmware, floors, counts] = await Promise.all([
    read
      .select()
      .from(credential)
      .where(eq(credential.deviceId, id))
      .orderBy(desc(credential.issuedAt))
      .limit(10),
    read
      .select({ expiresAt: enrolmentCode.expiresAt, triesLeft: enrolmentCode.triesLeft })
      .from(enrolmentCode)
      .where(
        and(
          eq(enrolmentCode.deviceId, id),
          isNull(enrolmentCode.usedAt),
          isNull(enrolmentCode.withdrawnAt),
          gt(enrolmentCode.expiresAt, now),
        ),
      )
      .limit(1),
    read
      .select({
        id: recording.id,
        number: recording.number,
        stage: recording.stage,
        stopped: recording.stopped,
        verdict: recording.verdict,
        findings: recording.findings,
        recordedAt: recording.recordedAt,
        awaitedAt: recording.awaitedAt,
        durationSeconds: recording.durationSeconds,
        site: recording.site,
      })
      .from(recording)
      .where(eq(recording.deviceId, id))
      .orderBy(desc(recording.awaitedAt))
      .limit(20),
    read
      .select()
      .from(firmwareChange)
      .where(eq(firmwareChange.deviceId, id))
      .orderBy(desc(firmwareChange.at))
      .limit(20),
    noiseFloors(services, [id], now),
    read
      .select({ verdict: recording.verdict, n: sql<number>`count(*)` })
      .from(recording)
      .where(eq(recording.deviceId, id))
      .groupBy(recording.verdict),
  ]);
  return {
    ...row,
    credentials,
    openCode: code[0] ?? null,
    clips,
    firmwareChanges: firmware,
    noiseFloor: floors.get(id) ?? [],
    counts,
  };
}
export type DeviceView = NonNullable<Awaited<ReturnType<typeof readDevice>>>;

/** Device models with how many devices of each there are. */
export async function readModels(services: Pick<Services, 'read'>, _by: Authorized<'model.read'>) {
  return await services.read
    .select({ model: deviceModel, devices: sql<number>`count(${device.id})` })
    .from(deviceModel)
    .leftJoin(device, eq(device.modelId, deviceModel.id))
    .groupBy(deviceModel.id)
    .orderBy(asc(deviceModel.name));
}

/** Devices by their ids or asset tags, in the order of their asset tags: for sheets and acts on a selection. */
export async function readDevices(
  services: Pick<Services, 'read'>,
  _by: Authorized<'fleet.write'>,
  ids: readonly string[],
) {
  if (ids.length === 0) return [];
  return await services.read
    .select({ device, model: deviceModel.name, ward: ward.name })
    .from(device)
    .innerJoin(deviceModel, eq(deviceModel.id, device.modelId))
    .leftJoin(ward, eq(ward.id, device.wardId))
    .where(or(inArray(device.id, [...ids]), inArray(device.assetTag, [...ids])))
    .orderBy(asc(device.assetTag));
}
