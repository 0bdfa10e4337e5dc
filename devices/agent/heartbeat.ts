import { HeartbeatAnswer, type HeartbeatRequest } from '@/lib/contract/device';
import { understood } from './answers';
import { deviceTime } from './clock';
import type { Device } from './device';
import { renew } from './renew';
import { withRetry } from './retry';

/** Say how the device is and hear the time; renew when the service asks for it. @throws ServiceProblem, NoAnswer */
export async function heartbeat(
  device: Device,
  report: Omit<HeartbeatRequest, 'deviceTime'> = {},
): Promise<HeartbeatAnswer> {
  const answer = await withRetry(device, async () =>
    understood(
      HeartbeatAnswer,
      await device.call('/api/device/v1/heartbeat', {
        ...report,
        deviceTime: deviceTime(device.clock.now()),
      } satisfies HeartbeatRequest),
    ),
  );
  if (answer.renew) await renew(device);
  return answer;
}
