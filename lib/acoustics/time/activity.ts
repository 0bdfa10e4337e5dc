import { FilterChain, highPass, lowPass } from '../dsp/biquad';
import { percentile } from '../dsp/percentile';
import type { Probe } from '../types';
import { Envelope } from './envelope';
import { rmsToDbfsSine } from './levels';

const BLOCK_SECONDS = 0.1;
const QUIETEST_DBFS = -120;
const BAND_HZ = { low: 100, high: 1000 };

export interface ActivityMeasures {
  noiseFloorDbfsSine: number | null;
  activityRangeDb: number | null;
}

/**
 * Noise floor and activity range: 10th percentile, and 90th less 10th, of 100 ms RMS of the 100-1000 Hz band, on the
 * stream divided to about 5 kHz. Steady breathing without pauses has range 0 by construction: it is an activity range,
 * not a signal-to-noise ratio.
 */
export class ActivityProbe implements Probe<ActivityMeasures> {
  readonly #band: Envelope;
  readonly #filter: FilterChain;

  constructor(rateHz: number) {
    this.#band = new Envelope(Math.max(1, Math.round(rateHz * BLOCK_SECONDS)));
    this.#filter = new FilterChain([
      highPass(BAND_HZ.low, rateHz),
      highPass(BAND_HZ.low, rateHz),
      ...(rateHz > 2.2 * BAND_HZ.high ? [lowPass(BAND_HZ.high, rateHz)] : []),
    ]);
  }

  push(samples: Float32Array): void {
    this.#band.push(this.#filter.run(samples), samples.length);
  }

  finish(): ActivityMeasures {
    // The filters ring at the start: their first block says nothing of the room.
    const blocks = this.#band.values.view().subarray(this.#band.values.length > 10 ? 1 : 0);
    if (blocks.length === 0) return { noiseFloorDbfsSine: null, activityRangeDb: null };
    const inDb = (fraction: number) => {
      const rms = percentile(blocks, fraction);
      return rms > 0 ? Math.max(QUIETEST_DBFS, rmsToDbfsSine(rms)) : QUIETEST_DBFS;
    };
    const floor = inDb(0.1);
    return { noiseFloorDbfsSine: floor, activityRangeDb: inDb(0.9) - floor };
  }
}
