/** The time, passed in so that a test can say what it is. UTC milliseconds since the epoch. */
export interface Clock {
  now(): number;
}

export const systemClock: Clock = { now: () => Date.now() };
