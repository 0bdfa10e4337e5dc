import { and, eq, isNull } from 'drizzle-orm';
import { device, encounter, firmwareChange, listeningSession } from '@/db/schema';
import type { HeartbeatAnswer, HeartbeatRequest } from '@/lib/contract/device';
import { appendEntries } from '@/lib/custody/append';
import { type AuthenticatedDevice, deviceActor } from '@/lib/keys/device';
import { shouldRenew } from '@/lib/keys/issueCredential';
import { newId } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';

/** A device says how it is; it hears the time, whether to renew, and which session it is in. */
export async function heartbeat(
  services: Pick<Services, 'read' | 'write' | 'clock'>,
  caller: AuthenticatedDevice,
  report: HeartbeatRequest,
): Promise<HeartbeatAnswer> {
  const now = services.clock.now();
  const clockOffsetMs = report.deviceTime - now;
  const firmware = report.firmware ?? caller.device.firmware;
  await services.write(async (tx) => {
    await tx
      .update(device)
      .set({
        lastHeardAt: now,
        clockOffsetMs,
        firmware,
        ...(report.batteryPercent === undefined ? {} : { batteryPercent: report.batteryPercent }),
      })
      .where(eq(device.id, caller.device.id));
    if (firmware === caller.device.firmware || firmware === null) return;
    await tx.insert(firmwareChange).values({
      id: newId(),
      deviceId: caller.device.id,
      from: caller.device.firmware,
      to: firmware,
      at: now,
    });
    await appendEntries(tx, now, [
      {
        kind: 'device-firmware-changed',
        actor: deviceActor(caller.device),
        subjects: [{ kind: 'device', id: caller.device.id }],
        before: { firmware: caller.device.firmware },
        after: { firmware },
      },
    ]);
  });
  const [open] = await services.read
    .select({ number: listeningSession.number, encounter: encounter.number })
    .from(listeningSession)
    .innerJoin(encounter, eq(encounter.id, listeningSession.encounterId))
    .where(and(eq(listeningSession.deviceId, caller.device.id), isNull(listeningSession.closedAt)))
    .limit(1);
  return {
    serverTime: now,
    clockOffsetMs,
    renew: shouldRenew(caller.credential, now),
    state: caller.device.state,
    session: open ?? null,
  };
}
