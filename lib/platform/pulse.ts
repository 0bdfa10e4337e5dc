/** When background work of this process was last done, and whether it went well. UTC ms. */
interface Beat {
  at: number;
  ok: boolean;
}
type Work = 'sweep';

const shared = globalThis as { bellkeepPulse?: { since: number; beats: Partial<Record<Work, Beat>> } };
const pulse = () => (shared.bellkeepPulse ??= { since: Date.now(), beats: {} });

/** Background work begins in this process: from here on it is missed where it stands still. */
export const beginPulse = (nowMs: number): void => {
  pulse().since = nowMs;
  pulse().beats = {};
};

export const beat = (work: Work, nowMs: number, ok: boolean): void => {
  pulse().beats[work] = { at: nowMs, ok };
};

export const lastBeat = (work: Work): Beat | null => pulse().beats[work] ?? null;
export const pulseSince = (): number => pulse().since;
