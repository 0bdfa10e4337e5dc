import type { Lookaround } from '../dsp/lookaround';
import type { Kernels } from '../kernels/types';

/**
 * Four filters of 12 taps for four times the rate: ITU-R BS.1770-4, Annex 2 (from memory), of which the third and
 * fourth are the second and first backwards.
 */
const FIRST = [
  0.001708984375, 0.010986328125, -0.0196533203125, 0.033203125, -0.0594482421875, 0.1373291015625,
  0.97216796875, -0.102294921875, 0.047607421875, -0.026611328125, 0.014892578125, -0.00830078125,
];
const SECOND = [
  -0.0291748046875, 0.029296875, -0.0517578125, 0.089111328125, -0.16650390625, 0.465087890625, 0.77978515625,
  -0.2003173828125, 0.1015625, -0.0582275390625, 0.0330810546875, -0.0189208984375,
];
const PHASES = [FIRST, SECOND, [...SECOND].reverse(), [...FIRST].reverse()];
/** Sound between samples is looked for about those that come this near to the loudest so far. */
const GATE = 0.7;
const TAPS_BESIDE = 6;

/**
 * True peak: the largest of the sound between its samples, at four times the rate (ITU-R BS.1770-4, Annex 2). Only the
 * surroundings of samples within 3 dB of the loudest so far are looked at: an overshoot from lower down is missed. The
 * first and last samples of a clip, without context, count as they are.
 */
export class TruePeakProbe {
  readonly #taps: Float32Array;
  /** Largest and smallest so far. */
  readonly #reached: Float32Array;

  constructor(
    private readonly kernels: Kernels,
    private readonly around: Lookaround,
  ) {
    if (around.reach < TAPS_BESIDE) throw new RangeError('a true peak needs six samples on both sides');
    this.#taps = kernels.arena.floats(48);
    PHASES.forEach((phase, p) => {
      phase.forEach((tap, j) => {
        this.#taps[4 * j + p] = tap;
      });
    });
    this.#reached = kernels.arena.floats(4);
    this.#reached.set([Number.NEGATIVE_INFINITY, Number.POSITIVE_INFINITY]);
  }

  /** Look at what the last push of the stream brought. @param largest magnitude of all samples so far */
  look(largest: number): void {
    const { x, reach, to } = this.around;
    if (to <= reach || largest === 0) return;
    this.kernels.betweenSamples(this.#taps, x, reach, to - reach, GATE * largest, this.#reached);
  }

  /** @param extremes of the samples themselves, which a true peak is never below */
  finish(extremes: { min: number; max: number }): { min: number; max: number } {
    return {
      max: Math.max(extremes.max, this.#reached[0] as number),
      min: Math.min(extremes.min, this.#reached[1] as number),
    };
  }
}
