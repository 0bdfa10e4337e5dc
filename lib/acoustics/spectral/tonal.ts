import type { Tonal } from '../types';

const LEAST_PROMINENCE_DB = 10;
const NEIGHBOURS_HZ = 150;
const RANGE_HZ = { low: 80, high: 1600 };
/** Anything shorter is left to the ear. */
const SHORTEST_SECONDS = 0.08;
const MOST = 200;

interface Track {
  first: number;
  last: number;
  bin: number;
  frequencies: number[];
  prominences: number[];
  gap: number;
}

/**
 * Tonal places: local maxima of the 64 ms spectrum at least 10 dB above the median of 150 Hz around, linked from frame
 * to frame within a bin or 3 %, over at most one missing frame. Length and pitch are stored as such; which side of
 * whose limit they fall on is for the display. Length is uncertain by half a window. False friends: monitor beeps,
 * speech; lines of hum are taken out by the caller.
 */
export class TonalProbe {
  readonly #binHz: number;
  readonly #low: number;
  readonly #high: number;
  readonly #reach: number;
  readonly #db: Float64Array;
  readonly #scratch: Float64Array;
  #tracks: Track[] = [];
  readonly #done: Track[] = [];
  #column = 0;

  constructor(
    binHz: number,
    bins: number,
    private readonly columnSeconds: number,
    private readonly windowSeconds: number,
  ) {
    this.#binHz = binHz;
    this.#low = Math.max(2, Math.ceil(RANGE_HZ.low / binHz));
    this.#high = Math.min(bins - 2, Math.floor(RANGE_HZ.high / binHz));
    this.#reach = Math.max(3, Math.round(NEIGHBOURS_HZ / binHz));
    this.#db = new Float64Array(bins);
    this.#scratch = new Float64Array(2 * this.#reach + 1);
  }

  /** @param power one column of the spectrum, linear, relative to a full-scale sine */
  push(power: Float64Array, scale: number): void {
    const peaks: { bin: number; hz: number; prominence: number }[] = [];
    for (let k = 0; k < this.#db.length; k++)
      this.#db[k] = 10 * Math.log10((power[k] as number) * scale + 1e-12);
    for (let k = this.#low; k <= this.#high; k++) {
      const here = this.#db[k] as number;
      if (here < -85 || here < (this.#db[k - 1] as number) || here <= (this.#db[k + 1] as number)) continue;
      if (here - this.#meanAround(k) < LEAST_PROMINENCE_DB - 4) continue;
      const prominence = here - this.#medianAround(k);
      if (prominence < LEAST_PROMINENCE_DB) continue;
      const [a, c] = [this.#db[k - 1] as number, this.#db[k + 1] as number];
      const shift = a - 2 * here + c === 0 ? 0 : (0.5 * (a - c)) / (a - 2 * here + c);
      peaks.push({ bin: k, hz: (k + shift) * this.#binHz, prominence });
    }
    this.#link(peaks);
    this.#column++;
  }

  /** Cheap, and never far above the median: most maxima are dismissed by it. */
  #meanAround(k: number): number {
    const from = Math.max(1, k - this.#reach);
    const to = Math.min(this.#db.length, k + this.#reach + 1);
    let sum = 0;
    for (let i = from; i < to; i++) sum += this.#db[i] as number;
    return sum / (to - from);
  }

  /** Median by insertion into a scratch array: two dozen values, thousands of times a second of sound. */
  #medianAround(k: number): number {
    const from = Math.max(1, k - this.#reach);
    const to = Math.min(this.#db.length, k + this.#reach + 1);
    const sorted = this.#scratch;
    let n = 0;
    for (let i = from; i < to; i++) {
      const value = this.#db[i] as number;
      let at = n++;
      while (at > 0 && (sorted[at - 1] as number) > value) {
        sorted[at] = sorted[at - 1] as number;
        at--;
      }
      sorted[at] = value;
    }
    return sorted[n >> 1] as number;
  }

  #link(peaks: { bin: number; hz: number; prominence: number }[]): void {
    const open: Track[] = [];
    for (const track of this.#tracks) {
      const at = peaks.findIndex((peak) => Math.abs(peak.bin - track.bin) <= Math.max(1, 0.03 * track.bin));
      const [peak] = at < 0 ? [] : peaks.splice(at, 1);
      if (peak) {
        track.last = this.#column;
        track.bin = peak.bin;
        track.frequencies.push(peak.hz);
        track.prominences.push(peak.prominence);
        track.gap = 0;
        open.push(track);
      } else if (++track.gap <= 1) open.push(track);
      else this.#close(track);
    }
    for (const peak of peaks)
      open.push({
        first: this.#column,
        last: this.#column,
        bin: peak.bin,
        frequencies: [peak.hz],
        prominences: [peak.prominence],
        gap: 0,
      });
    this.#tracks = open;
  }

  #close(track: Track): void {
    if (
      this.#lengthOf(track) >= SHORTEST_SECONDS &&
      track.frequencies.length >= 4 &&
      this.#done.length < MOST * 4
    )
      this.#done.push(track);
  }

  /** A tone shows in every window that holds half of it: what the window adds is taken off. */
  #lengthOf(track: Track): number {
    return (track.last - track.first + 1) * this.columnSeconds;
  }

  /** @param without lines of hum, Hz */
  finish(without: readonly number[]): Tonal[] {
    for (const track of this.#tracks) this.#close(track);
    const middle = (values: number[]) => [...values].sort((a, b) => a - b)[values.length >> 1] as number;
    return this.#done
      .map((track) => ({
        startSeconds: track.first * this.columnSeconds + this.windowSeconds / 2 - this.columnSeconds / 2,
        durationSeconds: this.#lengthOf(track),
        frequencyHz: middle(track.frequencies),
        prominenceDb: middle(track.prominences),
      }))
      .filter((tone) => !without.some((hz) => Math.abs(tone.frequencyHz - hz) < 0.03 * hz + 4))
      .sort((a, b) => a.startSeconds - b.startSeconds)
      .slice(0, MOST);
  }
}
