import type { Kernels } from '../kernels/types';
import type { Tonal } from '../types';
import { type ColumnLayout, type Columns, FLOOR_DB, STEP_DB } from './columns';

const LEAST_PROMINENCE_DB = 10;
const NEIGHBOURS_HZ = 150;
const RANGE_HZ = { low: 80, high: 1600 };
/** Nothing below this level is told. */
const LOWEST_DBFS = -85;
/** Maxima of one push; a sound with more is noise. */
const MOST_STANDOUTS = 8192;
/** Anything shorter is left to the ear: noise makes maxima that last as long as the window (CORSA: above 100 ms). */
const SHORTEST_SECONDS = 0.1;
const LONG_SECONDS = 0.2;
/** Median prominence of a tone, by how long it is: tried on noise, where one clip in ten shows one beside these. */
const LEAST_MEDIAN_DB = { short: 14, long: 12 };
/** Below this the heart and the edge of breath make short lines of their own. */
const LOW_PITCH = { belowHz: 200, leastSeconds: 0.2, leastDb: 16 };
const MOST = 200;

const middle = (values: number[]): number => [...values].sort((a, b) => a - b)[values.length >> 1] as number;
const inDb = (power: number): number => 10 * Math.log10(power + 1e-12);

interface Peak {
  bin: number;
  hz: number;
  prominence: number;
}

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
  readonly #search: { low: number; high: number; reach: number; least: number; over: number };
  readonly #found: Int32Array;
  #tracks: Track[] = [];
  readonly #done: Track[] = [];
  #column = 0;

  constructor(
    private readonly kernels: Kernels,
    private readonly layout: ColumnLayout,
  ) {
    const { binHz, bins } = layout;
    this.#search = {
      low: Math.max(2, Math.ceil(RANGE_HZ.low / binHz)),
      high: Math.min(bins - 2, Math.floor(RANGE_HZ.high / binHz)),
      reach: Math.max(3, Math.round(NEIGHBOURS_HZ / binHz)),
      least: Math.round((LOWEST_DBFS - FLOOR_DB) / STEP_DB),
      over: Math.round(LEAST_PROMINENCE_DB / STEP_DB),
    };
    this.#found = kernels.arena.ints(3 * MOST_STANDOUTS);
  }

  push({ power, shades, columns }: Columns): void {
    const { bins } = this.layout;
    const count = this.kernels.standouts(shades, columns, bins, this.#search, this.#found);
    for (let row = 0, at = 0; row < columns; row++) {
      const peaks: Peak[] = [];
      for (; at < count && this.#found[3 * at] === row; at++)
        peaks.push(
          this.#peak(power, row * bins, this.#found[3 * at + 1] as number, this.#found[3 * at + 2] as number),
        );
      if (peaks.length > 0 || this.#tracks.length > 0) this.#link(peaks);
      this.#column++;
    }
  }

  /** @param base where the column begins; @param found bin of a maximum of the shades, whose neighbour may be as light */
  #peak(power: Float32Array, base: number, found: number, median: number): Peak {
    const { sineScale, binHz } = this.layout;
    const k = (power[base + found - 1] as number) > (power[base + found] as number) ? found - 1 : found;
    const a = inDb((power[base + k - 1] as number) * sineScale);
    const here = inDb((power[base + k] as number) * sineScale);
    const c = inDb((power[base + k + 1] as number) * sineScale);
    const shift = a - 2 * here + c === 0 ? 0 : (0.5 * (a - c)) / (a - 2 * here + c);
    return { bin: k, hz: (k + shift) * binHz, prominence: here - (FLOOR_DB + STEP_DB * median) };
  }

  #link(peaks: Peak[]): void {
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
    if (track.frequencies.length < 4 || this.#done.length >= MOST * 4) return;
    const seconds = this.#lengthOf(track);
    const { long, short } = LEAST_MEDIAN_DB;
    const low = middle(track.frequencies) < LOW_PITCH.belowHz;
    const leastSeconds = low ? LOW_PITCH.leastSeconds : SHORTEST_SECONDS;
    const leastDb = low ? LOW_PITCH.leastDb : seconds >= LONG_SECONDS ? long : short;
    if (seconds >= leastSeconds && middle(track.prominences) >= leastDb) this.#done.push(track);
  }

  /** A tone shows in every window that holds half of it: what the window adds is taken off. */
  #lengthOf(track: Track): number {
    return (track.last - track.first + 1) * this.layout.columnSeconds;
  }

  /** @param without lines of hum, Hz */
  finish(without: readonly number[]): Tonal[] {
    const { columnSeconds, windowSeconds } = this.layout;
    for (const track of this.#tracks) this.#close(track);
    return this.#done
      .map((track) => ({
        startSeconds: track.first * columnSeconds + windowSeconds / 2 - columnSeconds / 2,
        durationSeconds: this.#lengthOf(track),
        frequencyHz: middle(track.frequencies),
        prominenceDb: middle(track.prominences),
      }))
      .filter((tone) => !without.some((hz) => Math.abs(tone.frequencyHz - hz) < 0.03 * hz + 4))
      .sort((a, b) => a.startSeconds - b.startSeconds)
      .slice(0, MOST);
  }
}
