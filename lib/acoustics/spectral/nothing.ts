import type { Measures } from '../types';

type Spectral = Pick<
  Measures,
  | 'truePeakDbfs'
  | 'hum'
  | 'bandwidthHz'
  | 'brickWall'
  | 'upsampled'
  | 'breathRate'
  | 'breaths'
  | 'heartRate'
  | 'tonal'
  | 'explosive'
>;

/** Measures that are not taken yet, said as what is not known. */
export const NOTHING_SPECTRAL: Spectral = {
  truePeakDbfs: null,
  hum: null,
  bandwidthHz: null,
  brickWall: false,
  upsampled: false,
  breathRate: null,
  breaths: null,
  heartRate: null,
  tonal: [],
  explosive: [],
};
