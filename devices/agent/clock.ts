/** A device's own clock: often wrong, sometimes by years. UTC milliseconds. */
export interface DeviceClock {
  now(): number;
}

/** @param offsetMs how far the device's clock is ahead of the true time */
export const clockWithOffset = (
  offsetMs: number,
  base: DeviceClock = { now: () => Date.now() },
): DeviceClock => ({
  now: () => base.now() + offsetMs,
});
