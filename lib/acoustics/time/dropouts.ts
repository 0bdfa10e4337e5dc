import type { Dropout } from '../types';
import { SHORT_SECONDS } from './levels';

/** Runs kept for judging at the end; a file with more is broken beyond counting. */
const MOST_RUNS = 20_000;
const SHORTEST_SECONDS = 0.001;
const SHORTEST_SAMPLES = 8;
/** A run this long needs no jump at its edge to be a hole in the sound. */
const LONG_SECONDS = 0.02;
/** Context: 50 ms on either side, in blocks of 10 ms; the nearest two decide how abrupt the edge is. */
const CONTEXT_BLOCKS = 5;
const NEAREST_BLOCKS = 2;
const LEAST_CONTEXT_STEPS = 4;
/** How far from a run its edge is looked at. */
const EDGE_SECONDS = 0.002;
/** Loudest within the edge against the RMS of the context: a hole is cut, a sound that dies away is not. */
const LEAST_EDGE = 0.25;
/** Loudest of the two samples at the run against the nearest context: tells a cut where the context is louder still. */
const TIP_SAMPLES = 2;
const LEAST_TIP = 0.15;
const LEAST_JUMP = 0.1;
/** An edge within this many steps is the last code of a sound that died away. */
const TINY_STEPS = 2;

interface Edge {
  largest: number;
  tip: number;
}

interface Run {
  start: number;
  length: number;
  value: number;
  /** The larger step at its two edges. */
  jump: number;
  /** Largest distance from the run's value within 2 ms before and after it, and of the two samples next to it. */
  before: Edge;
  after: Edge;
  /** Samples that `after` still waits for. */
  wanted: number;
}

/**
 * Holes: runs of equal samples, of at least 8 samples and 1 ms, with sound on both sides (50 ms of more than 4 steps
 * RMS each). Consecutive-sample practice, general (from memory). Equal samples also stand between the beats of a clip
 * without any noise, where the sound dies away into the last code, and on top of a slow wave. So the sound must be cut
 * on both sides: within 2 ms of either edge it is about as loud as around, and a short run also
 * begins or ends with a jump (both ours, tried on synthetic sounds with and without a noise floor). Runs at the rail
 * or at the signal's own extreme are clipping, and not counted here.
 */
export class DropoutProbe {
  readonly #runs: Run[] = [];
  /** Runs whose surroundings after them are not all there yet: the last few of `#runs`. */
  #open: Run[] = [];
  readonly #shortest: number;
  readonly #edge: number;
  /** The samples before this push, as many as an edge needs. */
  readonly #tail: Float32Array;
  /** The run that reaches to the end of what was pushed. */
  #value = Number.NaN;
  #length = 0;
  #jumpIn = 0;
  #edgeBefore: Edge = { largest: 0, tip: 0 };
  #frames = 0;

  constructor(
    private readonly sampleRateHz: number,
    private readonly step: number,
    private readonly coarse: boolean,
  ) {
    this.#shortest = Math.max(SHORTEST_SAMPLES, Math.ceil(sampleRateHz * SHORTEST_SECONDS));
    this.#edge = Math.max(2, Math.round(sampleRateHz * EDGE_SECONDS));
    this.#tail = new Float32Array(this.#edge);
  }

  push(samples: Float32Array): void {
    const n = samples.length;
    if (n === 0) return;
    if (this.#open.length > 0) this.#lookAfter(samples, 0, n);
    let at = 0;
    while (at < n && samples[at] === this.#value) at++;
    this.#length += at;
    if (at < n) {
      this.#close(samples, at, this.#frames + at - this.#length, this.#length);
      this.#scan(samples, at);
    }
    this.#remember(samples);
    this.#frames += n;
  }

  /** Runs from `from` on. A run of the shortest length covers one of every `shortest - 1` neighbours: only those are compared. */
  #scan(samples: Float32Array, from: number): void {
    const n = samples.length;
    const stride = this.#shortest - 1;
    let at = from;
    for (let i = from; i + 1 < n; i += stride) {
      const value = samples[i] as number;
      if (value !== samples[i + 1]) continue;
      let start = i;
      while (start > at && samples[start - 1] === value) start--;
      let end = i + 2;
      while (end < n && samples[end] === value) end++;
      if (end === n) break;
      if (end - start >= this.#shortest) {
        this.#begin(samples, start);
        this.#close(samples, end, this.#frames + start, end - start);
      }
      at = end;
      // The walk goes on from the run's end; the loop adds a stride.
      i = end - stride;
    }
    const value = samples[n - 1] as number;
    let start = n - 1;
    while (start > from && samples[start - 1] === value) start--;
    this.#value = value;
    this.#length = n - start;
    this.#begin(samples, start);
  }

  /** What stands before a run that starts at `start`. */
  #begin(samples: Float32Array, start: number): void {
    const value = samples[start] as number;
    let largest = 0;
    let tip = 0;
    for (let back = 1; back <= this.#edge; back++) {
      const distance = Math.abs(this.#before(samples, start - back) - value);
      if (back === 1) this.#jumpIn = distance;
      if (distance > largest) largest = distance;
      if (back <= TIP_SAMPLES) tip = largest;
    }
    this.#edgeBefore = { largest, tip };
  }

  #before(samples: Float32Array, index: number): number {
    return (index >= 0 ? samples[index] : this.#tail[this.#edge + index]) ?? 0;
  }

  #close(samples: Float32Array, end: number, start: number, length: number): void {
    if (length < this.#shortest || this.#runs.length >= MOST_RUNS) return;
    if (this.#edgeBefore.largest <= TINY_STEPS * this.step) return;
    const value = end > 0 ? (samples[end - 1] as number) : this.#value;
    const jumpOut = Math.abs((samples[end] as number) - value);
    const run: Run = {
      start,
      length,
      value,
      jump: Math.max(this.#jumpIn, jumpOut),
      before: this.#edgeBefore,
      after: { largest: 0, tip: 0 },
      wanted: this.#edge,
    };
    this.#runs.push(run);
    this.#open.push(run);
    this.#lookAfter(samples, end, samples.length, run);
  }

  #lookAfter(samples: Float32Array, from: number, to: number, only?: Run): void {
    for (const run of only ? [only] : this.#open) {
      const end = Math.min(to, from + run.wanted);
      for (let i = from; i < end; i++) {
        const distance = Math.abs((samples[i] as number) - run.value);
        if (distance > run.after.largest) run.after.largest = distance;
        if (run.wanted > this.#edge - TIP_SAMPLES) run.after.tip = run.after.largest;
        run.wanted--;
      }
    }
    this.#open = this.#open.filter((run) => run.wanted > 0);
  }

  #remember(samples: Float32Array): void {
    const kept = Math.min(samples.length, this.#edge);
    this.#tail.copyWithin(0, kept);
    this.#tail.set(samples.subarray(samples.length - kept), this.#edge - kept);
  }

  /**
   * @param shortVariance variance a 10 ms block, from LevelProbe
   * @param extremes smallest and largest sample of the channel
   */
  finish(shortVariance: Float32Array, extremes: { min: number; max: number }): Dropout[] {
    const block = Math.max(1, Math.round(this.sampleRateHz * SHORT_SECONDS));
    return this.#runs
      .filter((run) => {
        const atExtreme =
          run.value >= extremes.max - 1.5 * this.step || run.value <= extremes.min + 1.5 * this.step;
        if (run.value !== 0 && atExtreme) return false;
        const first = Math.floor(run.start / block) - 1;
        const last = Math.floor((run.start + run.length) / block) + 1;
        return this.#isHole(run, contextOf(shortVariance, first, -1), contextOf(shortVariance, last, 1));
      })
      .map((run) => ({
        kind: run.value === 0 ? 'zero' : 'held',
        startSeconds: run.start / this.sampleRateHz,
        lengthSamples: run.length,
      }));
  }

  #isHole(run: Run, before: Context, after: Context): boolean {
    const least = LEAST_CONTEXT_STEPS * this.step;
    if (before.rms <= least || after.rms <= least) return false;
    const seconds = run.length / this.sampleRateHz;
    if (this.coarse && seconds < LONG_SECONDS) return false;
    if (!isCut(run.before, before) || !isCut(run.after, after)) return false;
    if (run.after.largest <= TINY_STEPS * this.step) return false;
    return (
      seconds >= LONG_SECONDS || run.jump > Math.max(least, LEAST_JUMP * Math.min(before.rms, after.rms))
    );
  }
}

interface Context {
  /** RMS of the 50 ms, and of the 20 ms nearest to the run. */
  rms: number;
  nearestRms: number;
}

const isCut = (edge: Edge, context: Context): boolean =>
  edge.largest >= LEAST_EDGE * context.rms ||
  edge.tip >= LEAST_TIP * Math.min(context.rms, context.nearestRms);

/** The blocks from `from` on, away from the run. */
function contextOf(shortVariance: Float32Array, from: number, direction: 1 | -1): Context {
  let sum = 0;
  let nearest = 0;
  let n = 0;
  for (let k = 0; k < CONTEXT_BLOCKS; k++) {
    const variance = shortVariance[from + direction * k];
    if (variance === undefined) break;
    sum += variance;
    n++;
    if (k < NEAREST_BLOCKS) nearest = sum / n;
  }
  return { rms: n === 0 ? 0 : Math.sqrt(sum / n), nearestRms: Math.sqrt(nearest) };
}
