import type { Lookaround } from '../dsp/lookaround';
import type { Kernels } from '../kernels/types';
import type { Span } from '../types';

/** Samples looked at on either side of a candidate. */
export const REACH = 32;
/** Of these, the nearest are the spike's own. */
const OWN = 3;
const MOST_SPIKES = 2000;
/** A candidate's bend against the mean bend of the last blocks. */
const CANDIDATE = 6;
const BLOCK = 256;
const LEAST_MAD = 20;
/** What lies on either side of a spike differs by no more than this share of it: a step is not a spike. */
const MOST_STEP = 0.4;
const AT_RAIL = 0.999;

/** Within this many samples behind and before a spike nothing swings as far as it: a burst does, to the other side. */
const BESIDE = 6;
const MOST_BESIDE = 0.45;

/** Frames of one click: where it is, and whether it is one sample or two. */
interface Spike {
  frame: number;
  height: number;
}

/**
 * Transmission clicks of one or two samples: a sample, or two, that stands off the line between its neighbours by more
 * than 20 median absolute deviations of how the samples around do, while the sound goes on behind it as if nothing had
 * been. Longer bursts are sound, or handling. The second difference stands in for the distance from a median of five:
 * it follows a wave near the top of its band as well as one far below. Method general, the limit ours.
 */
export class SpikeProbe {
  readonly #found: Spike[] = [];
  /** Mean bend of the blocks so far, and of the one that is not full. */
  #mean = 0;
  #sum = 0;
  #n = 0;

  readonly #runs: Float32Array;

  /** @param around reaches REACH samples or more */
  constructor(
    private readonly kernels: Kernels,
    private readonly around: Lookaround,
    private readonly sampleRateHz: number,
    private readonly step: number,
  ) {
    this.#runs = kernels.arena.floats(2 * (Math.ceil(around.x.length / BLOCK) + 2));
  }

  /** Look at what the last push of the stream brought. */
  look(): void {
    const { x, reach, to, offset } = this.around;
    if (to <= reach) return;
    const runs = this.kernels.bends(x, reach, to - reach, BLOCK - this.#n, BLOCK, this.#runs);
    let at = reach;
    for (let k = 0; k < runs; k++) {
      const end = Math.min(to, at + BLOCK - this.#n);
      const limit = CANDIDATE * this.#mean + 8 * this.step;
      if ((this.#runs[2 * k + 1] as number) > limit) this.#scan(x, at, end, limit, offset);
      this.#sum += this.#runs[2 * k] as number;
      this.#n += end - at;
      at = end;
      if (this.#n === BLOCK) this.#closeBlock();
    }
  }

  #scan(x: Float32Array, from: number, to: number, limit: number, offset: number): void {
    for (let i = from; i < to; i++) {
      const here = x[i] as number;
      const bend = Math.abs(here + here - (x[i - 1] as number) - (x[i + 1] as number));
      if (bend > limit) this.#judge(x, i, offset);
    }
  }

  #closeBlock(): void {
    const mean = this.#sum / BLOCK;
    // Quick to follow downwards: a quiet stretch behind a loud one must not hide a click.
    this.#mean = this.#mean === 0 ? mean : Math.min(mean, this.#mean + 0.5 * (mean - this.#mean));
    this.#sum = 0;
    this.#n = 0;
  }

  #judge(x: Float32Array, i: number, offset: number): void {
    if (this.#found.length >= MOST_SPIKES) return;
    const before = x[i - 1] as number;
    const here = x[i] as number;
    const next = x[i + 1] as number;
    const one = Math.abs(here - (before + next) / 2);
    const two = Math.abs(here + next - before - (x[i + 2] as number)) / 2;
    // A second sample that is as far out as the first belongs to it.
    const width = two > 0.75 * Math.abs(here - before) && two > one ? 2 : 1;
    const height = width === 2 ? two : one;
    const behind = x[i + width] as number;
    // Between two samples at the rail nobody knows what the sound was.
    if (Math.max(Math.abs(before), Math.abs(behind)) >= AT_RAIL) return;
    if (Math.abs(before - behind) > MOST_STEP * height) return;
    if (width === 2 && Math.abs(here - next) > MOST_STEP * height) return;
    if (this.#swings(x, i, width) > MOST_BESIDE * height) return;
    if (!this.#standsOut(x, i, width, height / LEAST_MAD)) return;
    this.#note({ frame: offset + i, height });
  }

  /** Furthest that the samples beside a spike go from the middle of its two neighbours. */
  #swings(x: Float32Array, i: number, width: number): number {
    const middle = ((x[i - 1] as number) + (x[i + width] as number)) / 2;
    let furthest = 0;
    for (let k = 1; k <= BESIDE; k++) {
      const before = Math.abs((x[i - k] as number) - middle);
      const after = Math.abs((x[i + width - 1 + k] as number) - middle);
      furthest = Math.max(furthest, before, after);
    }
    return furthest;
  }

  /**
   * Whether the samples around stray less than `limit` from the line between their neighbours: by the median, and, as a
   * wave of a few samples a period has bends of none and all, by half their mean.
   */
  #standsOut(x: Float32Array, i: number, width: number, limit: number): boolean {
    if (limit <= this.step / 2) return false;
    let n = 0;
    let sum = 0;
    let below = 0;
    for (let k = i - REACH + 1; k < i + REACH - 1; k++) {
      if (k > i - OWN && k < i + width - 1 + OWN) continue;
      const bend = Math.abs((x[k] as number) - ((x[k - 1] as number) + (x[k + 1] as number)) / 2);
      sum += bend;
      if (bend < limit) below++;
      n++;
    }
    return sum / n / 2 < limit && below > n / 2;
  }

  #note(spike: Spike): void {
    const last = this.#found.at(-1);
    if (last === undefined || spike.frame - last.frame > 2) this.#found.push(spike);
    else if (spike.height > last.height) this.#found[this.#found.length - 1] = spike;
  }

  /** @param leastHeight full scale: what is smaller is not heard as a click */
  finish(leastHeight: number): Span[] {
    return this.#found
      .filter((spike) => spike.height >= leastHeight)
      .map(({ frame }) => ({ startSeconds: frame / this.sampleRateHz, durationSeconds: 0 }));
  }
}
