import type { Arena } from '../kernels/arena';
import type { Encoding, FlatTop } from '../types';
import { toDbfs } from './levels';

/** A run shorter than this is a peak that happens to touch the rail: a full-scale sine of 97 Hz at 8 kHz does. */
const SHORTEST_RUN = 3;
/** Codes below the extreme that its pile is weighed against. */
const WINDOW = 33;
/** No pile is smaller. */
const LEAST_PILE = 20;
/** A pile this many times as high as the codes below it was cut. Unclipped sound: 0.2 to 10; cut: 400 and more. */
const LEAST_RATIO = 50;
/** With a run at the rail to go with it, less will do: the tops of a slow full-scale wave reach 4. */
const LEAST_RATIO_WITH_RUN = 10;
/** Below this many 16-bit codes the converter's own noise makes piles. */
const LEAST_EXTREME = 256;
/** From here on a flat top is clipping at the rail. */
const RAIL_CODE = 32_760;
/** A square wave is all pile: it was made so, not cut. */
const SQUARE_SHARE = 0.4;
const ENOUGH_CODES = 16;
const NEAR_SECONDS = 0.5;
const MOST_SPANS = 200;

/** The range that counts as the rail: within one code of it, at 16 bit at the finest. */
function railOf(encoding: Encoding, bitDepth: number | null): { high: number; low: number } {
  // The outermost codes of G.711 are 32124 (mu-law) and 32256 (A-law).
  if (encoding === 'mulaw' || encoding === 'alaw') return { high: 32_000 / 32_768, low: -32_000 / 32_768 };
  const codes = 2 ** (Math.min(bitDepth ?? 16, 16) - 1);
  return { high: (codes - 2) / codes, low: -(codes - 1) / codes };
}

export interface RailMeasures {
  clippedSamples: number;
  clippedFraction: number;
  clippedLongestRunSamples: number;
  /** Where it is clipped: first frame and the one after the last, in order; places less than half a second apart are one. */
  clippedSpans: [from: number, to: number][];
  overFullScale: number;
  flatTop: FlatTop | null;
  /** Different codes in use, counted up to sixteen. */
  distinctCodes: number;
}

/**
 * One side of a channel: what lies at its rail, and what lies at its own extreme. Amplitudes come with the sign turned
 * for the lower side, so that the extreme is always the largest.
 */
class Side {
  atRail = 0;
  longestRun = 0;
  /** Runs of two or more at the rail. */
  railRuns = 0;
  readonly spans: [from: number, to: number][] = [];
  extreme = -40_000;
  extremeRuns = 0;
  #run = 0;
  #extremeRun = 0;

  /**
   * @param near frames between two places that are told as one
   * @param histogram 65,536 zeros; complete for the codes from `extreme - WINDOW` up: that is all that is asked of it
   */
  constructor(
    private readonly near: number,
    private readonly histogram: Int32Array,
  ) {}

  /** Nothing in the stretch comes near: runs end. */
  pass(): void {
    this.#run = 0;
    this.#extremeRun = 0;
  }

  isNear(amplitude: number): boolean {
    return amplitude * 32_768 >= this.extreme - WINDOW - 1;
  }

  look(samples: Float32Array, from: number, to: number, sign: 1 | -1, rail: number, offset: number): void {
    for (let i = from; i < to; i++) {
      const x = sign * (samples[i] as number);
      if (x >= rail) this.#atRail(offset + i);
      else this.#run = 0;
      this.#count(x);
    }
  }

  /** Float samples beyond full scale are neither at the rail nor in the pile. */
  lookFloat(
    samples: Float32Array,
    from: number,
    to: number,
    sign: 1 | -1,
    rail: number,
    offset: number,
  ): number {
    let over = 0;
    for (let i = from; i < to; i++) {
      const x = sign * (samples[i] as number);
      if (x > 1) {
        over++;
        this.pass();
        continue;
      }
      if (x >= rail) this.#atRail(offset + i);
      else this.#run = 0;
      this.#count(x);
    }
    return over;
  }

  #atRail(frame: number): void {
    this.atRail++;
    this.#run++;
    if (this.#run === 2) this.railRuns++;
    if (this.#run > this.longestRun) this.longestRun = this.#run;
    const span = this.spans.at(-1);
    if (span && (frame - span[1] < this.near || this.spans.length >= MOST_SPANS)) span[1] = frame + 1;
    else this.spans.push([frame, frame + 1]);
  }

  #count(x: number): void {
    const code = Math.max(-32_768, Math.min(32_767, Math.round(x * 32_768)));
    this.histogram[code + 32_768] = (this.histogram[code + 32_768] as number) + 1;
    if (code < this.extreme - 1) {
      this.#extremeRun = 0;
      return;
    }
    if (code > this.extreme + 1) {
      this.extremeRuns = 0;
      this.#extremeRun = 0;
    }
    if (code > this.extreme) this.extreme = code;
    if (++this.#extremeRun === SHORTEST_RUN) this.extremeRuns++;
  }

  /** How many samples lie within one step of the extreme, and how much higher that is than the codes below. */
  pile(stepCodes: number): { samples: number; ratio: number } {
    const h = (step: number) => this.histogram[this.extreme + 32_768 - step * stepCodes] ?? 0;
    const samples = h(0) + h(1);
    let below = 0;
    for (let i = 2; i <= WINDOW; i++) below += h(i);
    return { samples, ratio: samples / 2 / Math.max(below / (WINDOW - 1), 0.05) };
  }
}

/**
 * Clipping at the rail, and tops that were cut below it.
 *
 * Rail: samples within one code of either end, on a side that shows cutting there: a run of 3 or more, or a pile with
 * runs of 2. Below the rail: a pile in the amplitude histogram at its own extreme (Laguna and Lerch, AES 141, 2016,
 * for the family of methods): with m the outermost 16-bit code, r = mean(h[m], h[m-1]) / max(mean(h[m-2..m-33]), 0.05)
 * >= 50, three runs of 3 or more within one code of m, and 20 samples in the pile. Not seen: tops that were cut before
 * a filter or a change of rate, which ripple. Float samples beyond 1.0 are over full scale, which is not clipping.
 */
export class RailProbe {
  readonly #high: number;
  readonly #low: number;
  readonly #float: boolean;
  readonly #stepCodes: number;
  readonly #upper: Side;
  readonly #lower: Side;
  readonly #codes = new Set<number>();
  #frames = 0;
  #over = 0;

  constructor(
    arena: Arena,
    encoding: Encoding,
    private readonly bitDepth: number | null,
    sampleRateHz: number,
  ) {
    const side = () => new Side(NEAR_SECONDS * sampleRateHz, arena.ints(65_536).fill(0));
    this.#upper = side();
    this.#lower = side();
    const { high, low } = railOf(encoding, bitDepth);
    this.#high = high;
    this.#low = -low;
    const companded = encoding === 'mulaw' || encoding === 'alaw';
    this.#stepCodes = companded ? 1 : 2 ** (16 - Math.min(bitDepth ?? 16, 16));
    this.#float =
      encoding.startsWith('float') || encoding === 'opus' || encoding === 'vorbis' || encoding === 'mp3';
  }

  /** A stretch of a few milliseconds with its extremes: only one that comes near a rail or an extreme is looked at. */
  look(samples: Float32Array, from: number, to: number, min: number, max: number): void {
    // Frames before this array, so that an index in it is a frame of the clip.
    const offset = this.#frames - from;
    if (max >= this.#high || this.#upper.isNear(max))
      this.#lookAt(this.#upper, samples, from, to, 1, this.#high, offset);
    else this.#upper.pass();
    if (-min >= this.#low || this.#lower.isNear(-min))
      this.#lookAt(this.#lower, samples, from, to, -1, this.#low, offset);
    else this.#lower.pass();
    for (let i = from; i < to && this.#codes.size < ENOUGH_CODES; i++)
      this.#codes.add(Math.round((samples[i] as number) * 32_768));
    this.#frames += to - from;
  }

  #lookAt(
    side: Side,
    samples: Float32Array,
    from: number,
    to: number,
    sign: 1 | -1,
    rail: number,
    offset: number,
  ): void {
    if (this.#float) this.#over += side.lookFloat(samples, from, to, sign, rail, offset);
    else side.look(samples, from, to, sign, rail, offset);
  }

  finish(): RailMeasures {
    const cut = [this.#upper, this.#lower].filter((side) => this.#isCutAtRail(side));
    const clippedSamples = cut.reduce((sum, side) => sum + side.atRail, 0);
    return {
      clippedSamples,
      clippedFraction: this.#frames > 0 ? clippedSamples / this.#frames : 0,
      clippedLongestRunSamples: Math.max(0, ...cut.map((side) => side.longestRun)),
      clippedSpans: merged(cut.flatMap((side) => side.spans)),
      overFullScale: this.#over,
      flatTop: this.#flatTop(),
      distinctCodes: this.#codes.size,
    };
  }

  #isCutAtRail(side: Side): boolean {
    if (side.atRail === 0) return false;
    const { samples, ratio } = side.pile(this.#stepCodes);
    if (side.longestRun >= SHORTEST_RUN && ratio >= LEAST_RATIO_WITH_RUN) return true;
    return side.railRuns >= SHORTEST_RUN && samples >= LEAST_PILE && ratio >= LEAST_RATIO;
  }

  #flatTop(): FlatTop | null {
    if (this.#frames === 0 || (this.bitDepth ?? 16) <= 8) return null;
    const positive = this.#isPile(this.#upper);
    const negative = this.#isPile(this.#lower);
    if (!positive && !negative) return null;
    const [up, down] = [this.#upper.extreme, this.#lower.extreme];
    const rail = positive && negative ? (up + down) / 2 : positive ? up : down;
    return {
      dbfs: toDbfs(rail / 32_768),
      side: positive && negative ? 'both' : positive ? 'positive' : 'negative',
    };
  }

  #isPile(side: Side): boolean {
    if (side.extreme <= LEAST_EXTREME || side.extreme >= RAIL_CODE || side.extremeRuns < 3) return false;
    const { samples, ratio } = side.pile(1);
    return samples >= LEAST_PILE && ratio >= LEAST_RATIO && samples / this.#frames < SQUARE_SHARE;
  }
}

/** Spans in order, those that overlap made one. */
function merged(spans: readonly [number, number][]): [number, number][] {
  const out: [number, number][] = [];
  for (const [from, to] of [...spans].sort((a, b) => a[0] - b[0])) {
    const last = out.at(-1);
    if (last && from <= last[1]) last[1] = Math.max(last[1], to);
    else out.push([from, to]);
  }
  return out;
}
