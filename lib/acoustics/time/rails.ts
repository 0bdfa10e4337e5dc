import type { Encoding, FlatTop } from '../types';
import { toDbfs } from './levels';

/** A run shorter than this is a peak that happens to touch the rail: a full-scale sine does (acoustics of 97 Hz at 8 kHz). */
const SHORTEST_RUN = 3;

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
  /** First and last frame of clipping; null without any. */
  clippedFrom: number | null;
  clippedTo: number | null;
  overFullScale: number;
  flatTop: FlatTop | null;
  /** Fewer than four codes are in use: the converter's own noise, or nothing. */
  distinctCodes: number;
}

/**
 * Clipping at the rail, and tops that were cut below it.
 *
 * Rail: runs of 3 or more samples within one code of either end. Below the rail: a pile in the amplitude histogram at
 * its own extreme (Laguna and Lerch, AES 141, 2016, for the family of methods): with m the outermost 16-bit code,
 * r = mean(h[m], h[m-1]) / max(mean(h[m-2..m-33]), 0.05) >= 50, three runs of 3 or more within one code of m, and 20
 * samples in the pile. Not seen: tops that were cut before a filter or a change of rate, which ripple.
 * Float samples beyond 1.0 are over full scale, which is not clipping.
 */
export class RailProbe {
  readonly #histogram = new Uint32Array(65_536);
  readonly #high: number;
  readonly #low: number;
  readonly #float: boolean;
  #frames = 0;
  #run = 0;
  #clipped = 0;
  #longest = 0;
  #first = -1;
  #last = -1;
  #over = 0;
  #top = -40_000;
  #bottom = 40_000;
  #topRun = 0;
  #topRuns = 0;
  #bottomRun = 0;
  #bottomRuns = 0;

  constructor(
    encoding: Encoding,
    private readonly bitDepth: number | null,
  ) {
    const { high, low } = railOf(encoding, bitDepth);
    this.#high = high;
    this.#low = low;
    this.#float =
      encoding.startsWith('float') || encoding === 'opus' || encoding === 'vorbis' || encoding === 'mp3';
  }

  push(samples: Float32Array): void {
    const high = this.#high;
    const low = this.#low;
    const histogram = this.#histogram;
    let run = this.#run;
    for (let i = 0; i < samples.length; i++) {
      const x = samples[i] as number;
      let code = Math.round(x * 32_768);
      if (code > 32_767) code = 32_767;
      else if (code < -32_768) code = -32_768;
      histogram[code + 32_768] = (histogram[code + 32_768] as number) + 1;
      if (x >= high || x <= low) {
        if (this.#float && (x > 1 || x < -1)) {
          this.#over++;
          if (run > 0) this.#closeRun(run, this.#frames + i);
          run = 0;
        } else run++;
      } else if (run > 0) {
        this.#closeRun(run, this.#frames + i);
        run = 0;
      }
      if (code >= this.#top - 1) this.#atTop(code);
      else this.#topRun = 0;
      if (code <= this.#bottom + 1) this.#atBottom(code);
      else this.#bottomRun = 0;
    }
    this.#run = run;
    this.#frames += samples.length;
  }

  #closeRun(run: number, end: number): void {
    if (run < SHORTEST_RUN) return;
    this.#clipped += run;
    if (run > this.#longest) this.#longest = run;
    if (this.#first < 0) this.#first = end - run;
    this.#last = end;
  }

  #atTop(code: number): void {
    if (code > this.#top + 1) {
      this.#topRuns = 0;
      this.#topRun = 0;
    }
    if (code > this.#top) this.#top = code;
    if (++this.#topRun === SHORTEST_RUN) this.#topRuns++;
  }

  #atBottom(code: number): void {
    if (code < this.#bottom - 1) {
      this.#bottomRuns = 0;
      this.#bottomRun = 0;
    }
    if (code < this.#bottom) this.#bottom = code;
    if (++this.#bottomRun === SHORTEST_RUN) this.#bottomRuns++;
  }

  finish(): RailMeasures {
    if (this.#run > 0) this.#closeRun(this.#run, this.#frames);
    let distinctCodes = 0;
    for (let i = 0; i < 65_536 && distinctCodes < 16; i++)
      if ((this.#histogram[i] as number) > 0) distinctCodes++;
    return {
      clippedSamples: this.#clipped,
      clippedFraction: this.#frames > 0 ? this.#clipped / this.#frames : 0,
      clippedLongestRunSamples: this.#longest,
      clippedFrom: this.#first < 0 ? null : this.#first,
      clippedTo: this.#last < 0 ? null : this.#last,
      overFullScale: this.#over,
      flatTop: this.#flatTop(),
      distinctCodes,
    };
  }

  #flatTop(): FlatTop | null {
    if (this.#frames === 0 || (this.bitDepth ?? 16) <= 8) return null;
    const positive = this.#top > 256 && this.#top < 32_760 && this.#isPile(this.#top, -1, this.#topRuns);
    const negative =
      this.#bottom < -256 && this.#bottom > -32_760 && this.#isPile(this.#bottom, 1, this.#bottomRuns);
    if (!positive && !negative) return null;
    const rail = positive && negative ? (this.#top - this.#bottom) / 2 : positive ? this.#top : -this.#bottom;
    return {
      dbfs: toDbfs(rail / 32_768),
      side: positive && negative ? 'both' : positive ? 'positive' : 'negative',
    };
  }

  #isPile(extreme: number, inward: 1 | -1, runs: number): boolean {
    const h = (code: number) => this.#histogram[code + 32_768] ?? 0;
    const pile = h(extreme) + h(extreme + inward);
    let below = 0;
    for (let i = 2; i <= 33; i++) below += h(extreme + inward * i);
    // A square wave is all pile: it was made so, not cut.
    return (
      pile >= 20 && runs >= 3 && pile / 2 / Math.max(below / 32, 0.05) >= 50 && pile / this.#frames < 0.4
    );
  }
}
