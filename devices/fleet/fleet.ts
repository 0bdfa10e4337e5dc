import { setMaxListeners } from 'node:events';
import { chanceOf } from './chance';
import { PowerLost } from './life';
import { Member, sleepUntil } from './member';
import type { FleetDevice, FleetOptions } from './options';

export interface Fleet {
  /** Switch every device off, as if the power went; what was recorded is on their disks. */
  stop(): Promise<void>;
  /** When all have sent their clips (`clipsEach`), or were stopped. Rejects when the simulation itself is broken. */
  readonly ended: Promise<void>;
}

const MINUTE_MS = 60_000;
/** How often a device whose recording is done tries to send the rest before it gives up. */
const SETTLE_TRIES = 60;

/**
 * A fleet that keeps uploading at a gentle pace. Each device lives for itself: one that is slow, refused or far away
 * holds nobody up, and tries again later, as a real one on a shelf does.
 */
export function startFleet(options: FleetOptions): Fleet {
  const stopping = new AbortController();
  // Each call of each device listens for the end.
  setMaxListeners(0, stopping.signal);
  const lives = options.devices.map((facts) => live(options, facts, stopping.signal));
  const ended = Promise.all(lives).then(() => undefined);
  ended.catch(() => stopping.abort());
  return {
    ended,
    async stop() {
      stopping.abort();
      await ended;
    },
  };
}

async function live(options: FleetOptions, facts: FleetDevice, stopping: AbortSignal): Promise<void> {
  const member = new Member(options, facts, stopping);
  const random = chanceOf(options.seed, facts.serialNumber, 'pace');
  const sleep = options.sleep ?? sleepUntil(stopping);
  const meanMs = (options.devices.length * MINUTE_MS) / options.pace;
  const wanted = options.clipsEach ?? Number.POSITIVE_INFINITY;
  try {
    // Not all at once in the first minute.
    await sleep(random() * meanMs);
    while (!stopping.aborted && (member.recorded < wanted || options.enough?.() === false)) {
      await member.round();
      await sleep(meanMs * (0.5 + random()));
    }
    for (let i = 0; i < SETTLE_TRIES && !stopping.aborted; i++) {
      if ((await member.settle()) === 0) return;
      await sleep(meanMs * random());
    }
  } catch (error) {
    // Switched off in the midst of something: that is what its disk is for.
    if (!(error instanceof PowerLost)) throw error;
  }
}
