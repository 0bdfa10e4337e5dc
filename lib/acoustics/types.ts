/**
 * The words that the acoustic part shares: what a decoder says of a file, what a probe says of the sound, and
 * the findings made of both. Names are stable; devices, pages and tests hold on to them.
 */

/** How the samples stood in the file. */
export type Encoding =
  | 'pcm-u8'
  | 'pcm-s16'
  | 'pcm-s24'
  | 'pcm-s32'
  | 'float32'
  | 'float64'
  | 'alaw'
  | 'mulaw'
  | 'flac'
  | 'opus'
  | 'vorbis'
  | 'mp3';

export type Container = 'wav' | 'rf64' | 'bw64' | 'flac' | 'ogg' | 'mp3';

/** What a file says about itself, before any sample was judged. */
export interface AudioFormat {
  container: Container;
  encoding: Encoding;
  lossy: boolean;
  /** The rate written in the file, in Hz. */
  sampleRateHz: number;
  /** Rate of what a lossy encoder was given, where the file tells it and decodes at another (OpusHead). */
  sourceSampleRateHz?: number;
  channels: number;
  /** Valid bits a sample (8 for A-law and mu-law); null where a lossy codec has none. */
  bitDepth: number | null;
  /** Frames (samples a channel) the file declares; null where it declares none (streamed headers, Ogg). */
  declaredFrames: number | null;
  /** Harmless irregularities of the container, each a short kebab-case word (`riff-size-wrong`). */
  oddities: string[];
}

/**
 * One block of sound: one Float32Array a channel, all of equal length, in units of full scale (a 16-bit code c
 * is c / 32768 exactly; 24-bit codes are exact too). Blocks are reused by the decoder: copy what you keep.
 */
export type AudioBlock = readonly Float32Array[];

export type Severity = 'note' | 'care' | 'repeat';
export type Verdict = 'usable' | 'care' | 'repeat';

export type FindingCode =
  | 'unreadable'
  | 'empty'
  | 'truncated'
  | 'container-odd'
  | 'type-mismatch'
  | 'lossy'
  | 'rate-unexpected'
  | 'bandwidth-limited'
  | 'too-short'
  | 'too-short-for-rates'
  | 'silent'
  | 'level-low'
  | 'clipped'
  | 'flat-topped'
  | 'over-full-scale'
  | 'dc-offset'
  | 'dropout'
  | 'hum'
  | 'noisy'
  | 'handling'
  | 'spikes'
  | 'channels-identical'
  | 'channel-dead'
  | 'implausible-rates';

/** One technical observation; `from` and `to` are seconds from the start of the clip. */
export interface Finding {
  code: FindingCode;
  severity: Severity;
  value?: number;
  unit?: string;
  threshold?: number;
  from?: number;
  to?: number;
  /** Zero-based channel, where the finding is of one channel only. */
  channel?: number;
}

export interface FlatTop {
  dbfs: number;
  side: 'positive' | 'negative' | 'both';
}
export interface Dropout {
  kind: 'zero' | 'held';
  startSeconds: number;
  lengthSamples: number;
}
export interface Hum {
  frequencyHz: number;
  /** Level of the fundamental against the 100-600 Hz RMS, dB. */
  relativeDb: number;
  amplitudeDbfs: number;
  /** 10th percentile over median of the demodulated amplitude, 0 to 1. */
  steadiness: number;
  harmonicsHz: number[];
}
export interface Span {
  startSeconds: number;
  durationSeconds: number;
}
export interface Rate {
  perMinute: number;
  confidence: number;
}
export interface Tonal extends Span {
  frequencyHz: number;
  prominenceDb: number;
}
export interface Explosive {
  startSeconds: number;
  initialDeflectionMs: number | null;
  twoCycleMs: number | null;
}

/** Levels, clipping, DC and dropouts of one channel. dBFS values are null for digital silence. */
export interface ChannelMeasures {
  peakDbfs: number | null;
  /** Of the sound between the samples too, at four times the rate (ITU-R BS.1770-4, Annex 2). */
  truePeakDbfs: number | null;
  rmsDbfsSine: number | null;
  activeLevelDbfsSine: number | null;
  crestDb: number | null;
  dcFraction: number;
  clippedFraction: number;
  clippedSamples: number;
  clippedLongestRunSamples: number;
  flatTop: FlatTop | null;
  dropouts: Dropout[];
}

/** All measures of one clip. Levels after removal of DC; `Sine`: 0 dBFS is the RMS of a full-scale sine (AES17). */
export interface Measures extends ChannelMeasures {
  sampleRateHz: number;
  channels: number;
  bitDepth: number | null;
  encoding: Encoding;
  container: Container;
  frames: number;
  durationSeconds: number;
  declaredFrames: number | null;
  hum: Hum | null;
  bandwidthHz: number | null;
  brickWall: boolean;
  upsampled: boolean;
  noiseFloorDbfsSine: number | null;
  activityRangeDb: number | null;
  handling: Span[];
  /** Share of 250 ms blocks touched by handling, 0 to 1. */
  handlingShare: number;
  spikes: { startSeconds: number }[];
  breathRate: Rate | null;
  breaths: number | null;
  heartRate: Rate | null;
  tonal: Tonal[];
  explosive: Explosive[];
  cleanStretch: { from: number; to: number } | null;
  /** Present for more than one channel. */
  perChannel?: ChannelMeasures[];
}

/** Multi-resolution waveform peaks of one clip (all channels folded to min/max over channels). */
export interface WaveformPeaks {
  /** Frames a bucket on the finest level. */
  framesPerBucket: number;
  frames: number;
  sampleRateHz: number;
  /** Interleaved min, max a bucket, as int8 (-127 to 127 = full scale). Each level halves the one before. */
  levels: Int8Array[];
}

/** Spectrogram of one clip as bytes: one column after another, lowest frequency first. */
export interface Spectrogram {
  columns: number;
  bins: number;
  /** Seconds from the start of the clip to the middle of column 0, and from one column to the next. */
  firstColumnSeconds: number;
  columnSeconds: number;
  /** Frequency of bin 0 is 0; of bin k, k * binHz. */
  binHz: number;
  /** byte b stands for floorDb + b * stepDb, dB re full-scale sine. */
  floorDb: number;
  stepDb: number;
  data: Uint8Array;
}

/** Limits by which findings are made of measures: the hospital's policy joined with the device model's profile. */
export interface JudgingLimits {
  /** Sample rates the model's recordings may have, Hz; empty: any. */
  expectedSampleRatesHz: number[];
  /** Media types the model's profile allows. */
  allowedMediaTypes: string[];
  allowLossy: boolean;
  minimumSeconds: number;
  minimumSecondsForRates: number;
  levelLowDbfs: number;
  silentDbfs: number;
  clippedCareFraction: number;
  clippedRepeatFraction: number;
  dcCareFraction: number;
  dcRepeatFraction: number;
  dropoutRepeatSeconds: number;
  dropoutRepeatFraction: number;
  humNoteDb: number;
  humRepeatDb: number;
  noiseFloorCareDbfs: number;
  activityRangeCareDb: number;
  handlingCareShare: number;
  handlingRepeatShare: number;
  bandwidthCareHz: number;
}
