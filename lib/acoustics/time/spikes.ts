import { percentile } from '../dsp/percentile';

/** Samples looked at on either side of a candidate. */
const REACH = 32;
const MOST_SPIKES = 2000;
/** A candidate's step against the running mean step. */
const CANDIDATE = 8;

/**
 * Transmission clicks of one or two samples: |x - median of 5 around it| above 20 median absolute deviations of its
 * surroundings, and the sound is back to itself two samples later. Longer bursts are sound, or handling.
 */
export class SpikeProbe {
  readonly #at: number[] = [];
  #work = new Float32Array(0);
  #kept = 0;
  #frames = 0;
  #meanStep = 0;
  readonly #decay: number;

  constructor(
    private readonly sampleRateHz: number,
    private readonly step: number,
  ) {
    this.#decay = 1 / Math.max(64, sampleRateHz * 0.05);
  }

  push(samples: Float32Array): void {
    const total = this.#kept + samples.length;
    if (this.#work.length < total) {
      const grown = new Float32Array(total + 4096);
      grown.set(this.#work.subarray(0, this.#kept));
      this.#work = grown;
    }
    const x = this.#work;
    x.set(samples, this.#kept);
    const offset = this.#frames - this.#kept;
    this.#scan(x, Math.max(1, Math.min(this.#kept, REACH)), total - REACH, offset);
    this.#frames += samples.length;
    const keep = Math.min(total, 2 * REACH);
    x.copyWithin(0, total - keep, total);
    this.#kept = keep;
  }

  #scan(x: Float32Array, from: number, to: number, offset: number): void {
    let mean = this.#meanStep;
    const decay = this.#decay;
    for (let i = from; i < to; i++) {
      const step = Math.abs((x[i] as number) - (x[i - 1] as number));
      if (step > CANDIDATE * mean + 8 * this.step && this.#at.length < MOST_SPIKES && this.#isSpike(x, i))
        this.#note(offset + i);
      mean += (Math.min(step, CANDIDATE * mean + this.step) - mean) * decay;
    }
    this.#meanStep = mean;
  }

  #isSpike(x: Float32Array, i: number): boolean {
    if (i < 4) return false;
    const around = Array.from(x.subarray(Math.max(0, i - REACH), i + REACH));
    const middle = percentile(around, 0.5);
    const mad = Math.max(
      percentile(
        around.map((v) => Math.abs(v - middle)),
        0.5,
      ),
      2 * this.step,
    );
    const five = percentile(Array.from(x.subarray(i - 2, i + 3)), 0.5);
    if (Math.abs((x[i] as number) - five) <= 20 * mad) return false;
    // Narrow: what stands two before and two after is the undisturbed sound.
    return Math.abs((x[i - 2] as number) - five) < 8 * mad && Math.abs((x[i + 2] as number) - five) < 8 * mad;
  }

  #note(frame: number): void {
    const last = this.#at.at(-1);
    // The second sample of a two-sample click is the same click.
    if (last === undefined || frame - last > 2) this.#at.push(frame);
  }

  finish(): { startSeconds: number }[] {
    return this.#at.map((frame) => ({ startSeconds: frame / this.sampleRateHz }));
  }
}
