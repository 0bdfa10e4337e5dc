import { setTimeout as wait } from 'node:timers/promises';
import { NoAnswer, ServiceProblem } from '../agent/answers';
import type { Device } from '../agent/device';
import { isWaiting } from '../agent/drain';
import { heartbeat } from '../agent/heartbeat';
import type { Queue } from '../agent/queue';
import type { Arguments } from './arguments';
import { sendWaiting } from './send';

/** Until it is told to stop: say how the device is, then send what waits. A refusal or a dead line is no end. */
export async function keepRunning(
  device: Device,
  queue: Queue,
  args: Arguments,
  signal: AbortSignal,
): Promise<void> {
  while (!signal.aborted) {
    try {
      const queued = (await queue.list()).filter(isWaiting).length;
      await heartbeat(device, {
        queued,
        ...(args.batteryPercent === null ? {} : { batteryPercent: args.batteryPercent }),
        ...(args.firmware === null ? {} : { firmware: args.firmware }),
      });
      await sendWaiting(device, queue, signal);
    } catch (error) {
      if (!(error instanceof ServiceProblem) && !(error instanceof NoAnswer)) throw error;
      console.error(`${new Date().toISOString()} ${error.message}`);
    }
    await wait(args.everySeconds * 1000, undefined, { signal }).catch(() => undefined);
  }
}
