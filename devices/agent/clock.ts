/** A device's own clock: often wrong, sometimes by years. UTC milliseconds. */
export interface DeviceClock {
  now(): number;
}

/** A clock that somebody may set, forwards or backwards, while the device runs. */
export interface SettableClock extends DeviceClock {
  offsetMs: number;
}

/** @param offsetMs how far the device's clock is ahead of the true time */
export function settableClock(offsetMs = 0, base: DeviceClock = { now: () => Date.now() }): SettableClock {
  return {
    offsetMs,
    now() {
      return base.now() + this.offsetMs;
    },
  };
}

/** The contract takes whole milliseconds of this era; a clock beyond it says the nearest end. */
const LATEST_MS = 4_102_444_800_000;

/** A time by the device's clock as the contract takes it. */
export const deviceTime = (milliseconds: number): number =>
  Math.min(LATEST_MS, Math.max(0, Math.round(milliseconds)));
