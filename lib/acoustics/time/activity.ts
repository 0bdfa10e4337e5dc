import { percentiles } from '../dsp/percentile';
import { rmsToDbfsSine } from './levels';

const QUIETEST_DBFS = -120;

export interface ActivityMeasures {
  noiseFloorDbfsSine: number | null;
  activityRangeDb: number | null;
}

/** Of what the activity is told: a band above most of the heart, in blocks of 100 ms. */
export const ACTIVITY_BAND_HZ = { low: 100, high: 1000 };
export const ACTIVITY_BLOCK_SECONDS = 0.1;

/**
 * Noise floor and activity range: 10th percentile, and 90th less 10th, of the 100 ms levels of the 100-1000 Hz band.
 * Steady breathing without pauses has range 0 by construction: it is an activity range, not a signal-to-noise ratio.
 *
 * @param meanSquares a block each, full scale squared
 */
export function activityOf(meanSquares: Float32Array): ActivityMeasures {
  if (meanSquares.length === 0) return { noiseFloorDbfsSine: null, activityRangeDb: null };
  const [quiet, loud] = percentiles(meanSquares, [0.1, 0.9]) as [number, number];
  const inDb = (meanSquare: number) =>
    meanSquare > 0 ? Math.max(QUIETEST_DBFS, rmsToDbfsSine(Math.sqrt(meanSquare))) : QUIETEST_DBFS;
  const floor = inDb(quiet);
  return { noiseFloorDbfsSine: floor, activityRangeDb: inDb(loud) - floor };
}
