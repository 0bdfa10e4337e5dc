import { HeartbeatAnswer, type HeartbeatRequest } from '@/lib/contract/device';
import type { Device } from './device';
import { renew } from './enrol';
import { withRetry } from './retry';

/** Say how the device is and hear the time; renew when the service asks for it. */
export async function heartbeat(
  device: Device,
  report: Omit<HeartbeatRequest, 'deviceTime'> = {},
): Promise<HeartbeatAnswer> {
  const answer = HeartbeatAnswer.parse(
    await withRetry(device, () =>
      device.call('/api/device/v1/heartbeat', { ...report, deviceTime: device.clock.now() }),
    ),
  );
  if (answer.renew) await renew(device);
  return answer;
}
