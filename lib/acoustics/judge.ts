import type { DecodeResult } from './decode/types';
import type { ChannelMeasures, Finding, JudgingLimits, Measures, Severity, Verdict } from './types';

/** Defaults are engineering choices, to be tuned on real recordings; the hospital's policy may change every one. */
export const DEFAULT_LIMITS: JudgingLimits = {
  expectedSampleRatesHz: [],
  allowedMediaTypes: [],
  allowLossy: false,
  minimumSeconds: 5,
  minimumSecondsForRates: 10,
  levelLowDbfs: -55,
  silentDbfs: -70,
  clippedCareFraction: 0.0001,
  clippedRepeatFraction: 0.01,
  dcCareFraction: 0.01,
  dcRepeatFraction: 0.1,
  dropoutRepeatSeconds: 0.2,
  dropoutRepeatFraction: 0.02,
  humNoteDb: -20,
  humRepeatDb: -6,
  noiseFloorCareDbfs: -50,
  activityRangeCareDb: 6,
  handlingCareShare: 0.05,
  handlingRepeatShare: 0.2,
  bandwidthCareHz: 1000,
};

/** A floor that stands this far below the sound does little harm, however high it is. */
const RANGE_THAT_EXCUSES_DB = 12;
/** Nor does one that is this far below all of the sound, heart included. */
const FLOOR_BELOW_LEVEL_DB = 20;
/** A tone has a crest factor near 3 dB: a steady one has no floor to speak of. */
const CREST_OF_A_TONE_DB = 4;
const LOWEST_NOISY_FLOOR_DBFS = -70;
const SHORTEST_FOR_DC_SECONDS = 2;
/** Fewer codes than this are the converter's own, unless they are far apart. */
const FEW_CODES = 4;
/** Above the one or two codes of an 8-bit converter at rest. */
const PEAK_AT_REST_DBFS = -36;
const ODD_BREATHS = { below: 6, above: 50 };
const ODD_BEATS = { below: 42, above: 185 };
const SURE_OF_A_RATE = 0.6;

/** What judging needs beside the measures; small JSON that is stored with them, so that it can be run again. */
export interface JudgingFacts {
  failure: DecodeResult['failure'];
  reason: string;
  oddities: string[];
  missingFrames: number;
  typeMatches: boolean;
  lossy: boolean;
  overFullScale: number;
  distinctCodes: number;
  identicalChannels: boolean;
  deadChannels: number[];
  /** The channel that the measures are of: the louder one. */
  mainChannel: number;
  /** Where the main channel is clipped, seconds. */
  clippedSpans: [from: number, to: number][];
}

/** The worst severity decides; a score would hide a fatal fault. */
export function verdictOf(findings: readonly Finding[]): Verdict {
  if (findings.some((finding) => finding.severity === 'repeat')) return 'repeat';
  return findings.some((finding) => finding.severity === 'care') ? 'care' : 'usable';
}

const above = (value: number, care: number, repeat: number): Severity | null =>
  value > repeat ? 'repeat' : value > care ? 'care' : null;

/**
 * Findings out of measures and facts, by the limits. One finding a code, from its first place to its last; another
 * channel adds one of its own, with its number, where it is worse than the main one. Pure, so that a changed policy can
 * be tried on what is stored.
 */
export function judge(measures: Measures | null, facts: JudgingFacts, limits: JudgingLimits): Finding[] {
  if (facts.failure === 'empty') return [{ code: 'empty', severity: 'repeat' }];
  if (facts.failure === 'unreadable' || !measures) return [{ code: 'unreadable', severity: 'repeat' }];
  const silent = isSilent(measures, facts, limits);
  return [
    ...ofTheFile(measures, facts, limits),
    ...ofTheRate(measures, limits),
    ...(silent ? [silence(measures, limits)] : []),
    ...ofOneChannel(measures, measures, limits, silent ? [] : facts.clippedSpans),
    ...overFullScale(facts),
    ...clicks(measures),
    ...(silent ? [] : ofTheSound(measures, limits)),
    ...ofTheChannels(measures, facts, limits),
  ];
}

function ofTheFile(m: Measures, facts: JudgingFacts, limits: JudgingLimits): Finding[] {
  const found: Finding[] = [];
  const short = m.durationSeconds < limits.minimumSeconds;
  if (facts.missingFrames > 0) {
    found.push({
      code: 'truncated',
      severity: short ? 'repeat' : 'care',
      value: facts.missingFrames / m.sampleRateHz,
      unit: 's',
      from: m.durationSeconds,
      to: m.durationSeconds,
    });
  }
  if (facts.oddities.length > 0) found.push({ code: 'container-odd', severity: 'note' });
  if (!facts.typeMatches) found.push({ code: 'type-mismatch', severity: 'note' });
  if (facts.lossy && !limits.allowLossy) found.push({ code: 'lossy', severity: 'care' });
  const length = { value: m.durationSeconds, unit: 's' };
  if (short)
    found.push({ code: 'too-short', severity: 'repeat', ...length, threshold: limits.minimumSeconds });
  else if (m.durationSeconds < limits.minimumSecondsForRates) {
    const threshold = limits.minimumSecondsForRates;
    found.push({ code: 'too-short-for-rates', severity: 'note', ...length, threshold });
  }
  return found;
}

function ofTheRate(m: Measures, limits: JudgingLimits): Finding[] {
  const found: Finding[] = [];
  const expected = limits.expectedSampleRatesHz;
  if (expected.length > 0 && !expected.includes(m.sampleRateHz)) {
    found.push({
      code: 'rate-unexpected',
      severity: 'repeat',
      value: m.sampleRateHz,
      unit: 'Hz',
      threshold: expected[0] ?? 0,
    });
  }
  // Above a noise floor of its own a steep edge may be the sound's.
  if (m.bandwidthHz !== null && m.upsampled) {
    found.push({
      code: 'bandwidth-limited',
      severity: m.bandwidthHz < limits.bandwidthCareHz ? 'care' : 'note',
      value: m.bandwidthHz,
      unit: 'Hz',
      threshold: limits.bandwidthCareHz,
    });
  }
  const isOdd = (perMinute: number, range: { below: number; above: number }) =>
    perMinute < range.below || perMinute > range.above;
  const odd = [
    m.breathRate && isOdd(m.breathRate.perMinute, ODD_BREATHS) ? m.breathRate : null,
    m.heartRate && isOdd(m.heartRate.perMinute, ODD_BEATS) ? m.heartRate : null,
  ].find((rate) => rate !== null);
  if (odd && odd.confidence >= SURE_OF_A_RATE)
    found.push({ code: 'implausible-rates', severity: 'note', value: odd.perMinute, unit: '/min' });
  return found;
}

const isSilent = (m: Measures, facts: JudgingFacts, limits: JudgingLimits): boolean =>
  m.peakDbfs === null ||
  m.activeLevelDbfsSine === null ||
  m.activeLevelDbfsSine < limits.silentDbfs ||
  (facts.distinctCodes < FEW_CODES && m.peakDbfs < PEAK_AT_REST_DBFS);

const silence = (m: Measures, limits: JudgingLimits): Finding => ({
  code: 'silent',
  severity: 'repeat',
  ...(m.activeLevelDbfsSine === null ? {} : { value: m.activeLevelDbfsSine, unit: 'dBFS' }),
  threshold: limits.silentDbfs,
});

/** What is measured for each channel: its rails, its offset, its holes. */
function ofOneChannel(
  m: ChannelMeasures,
  clip: Measures,
  limits: JudgingLimits,
  clippedSpans: readonly (readonly [number, number])[],
): Finding[] {
  const found: Finding[] = [];
  const clipped = above(m.clippedFraction, limits.clippedCareFraction, limits.clippedRepeatFraction);
  if (clipped && m.peakDbfs !== null) {
    const [first, last] = [clippedSpans[0], clippedSpans.at(-1)];
    found.push({
      code: 'clipped',
      severity: clipped,
      value: m.clippedFraction,
      unit: 'fraction',
      threshold: clipped === 'repeat' ? limits.clippedRepeatFraction : limits.clippedCareFraction,
      ...(first && last ? { from: first[0], to: last[1] } : {}),
    });
  }
  if (m.flatTop) found.push({ code: 'flat-topped', severity: 'care', value: m.flatTop.dbfs, unit: 'dBFS' });
  const dc =
    clip.durationSeconds >= SHORTEST_FOR_DC_SECONDS
      ? above(Math.abs(m.dcFraction), limits.dcCareFraction, limits.dcRepeatFraction)
      : null;
  if (dc)
    found.push({
      code: 'dc-offset',
      severity: dc,
      value: m.dcFraction,
      unit: 'fraction',
      threshold: dc === 'repeat' ? limits.dcRepeatFraction : limits.dcCareFraction,
    });
  return [...found, ...holes(m, clip, limits)];
}

function holes(m: ChannelMeasures, clip: Measures, limits: JudgingLimits): Finding[] {
  const [first, last] = [m.dropouts[0], m.dropouts.at(-1)];
  if (!first || !last) return [];
  const seconds = m.dropouts.reduce((sum, hole) => sum + hole.lengthSamples, 0) / clip.sampleRateHz;
  const repeat =
    seconds > limits.dropoutRepeatSeconds || seconds > limits.dropoutRepeatFraction * clip.durationSeconds;
  return [
    {
      code: 'dropout',
      severity: repeat ? 'repeat' : 'care',
      value: seconds,
      unit: 's',
      threshold: limits.dropoutRepeatSeconds,
      from: first.startSeconds,
      to: last.startSeconds + last.lengthSamples / clip.sampleRateHz,
    },
  ];
}

const overFullScale = (facts: JudgingFacts): Finding[] =>
  facts.overFullScale > 0
    ? [{ code: 'over-full-scale', severity: 'note', value: facts.overFullScale, unit: 'samples' }]
    : [];

function clicks(m: Measures): Finding[] {
  const [first, last] = [m.spikes[0], m.spikes.at(-1)];
  if (!first || !last) return [];
  const place = { from: first.startSeconds, to: last.startSeconds };
  return [{ code: 'spikes', severity: 'care', value: m.spikes.length, unit: 'count', ...place }];
}

function ofTheSound(m: Measures, limits: JudgingLimits): Finding[] {
  const found: Finding[] = [];
  if (m.activeLevelDbfsSine !== null && m.activeLevelDbfsSine < limits.levelLowDbfs) {
    found.push({
      code: 'level-low',
      severity: 'care',
      value: m.activeLevelDbfsSine,
      unit: 'dBFS',
      threshold: limits.levelLowDbfs,
    });
  }
  if (m.hum) {
    const { relativeDb } = m.hum;
    const severity =
      relativeDb > limits.humRepeatDb ? 'repeat' : relativeDb >= limits.humNoteDb ? 'care' : 'note';
    found.push({
      code: 'hum',
      severity,
      value: relativeDb,
      unit: 'dB',
      threshold: severity === 'repeat' ? limits.humRepeatDb : limits.humNoteDb,
    });
  }
  return [...found, ...noise(m, limits), ...contact(m, limits)];
}

/** Noise that stands still between the breaths, or hides them. */
function noise(m: Measures, limits: JudgingLimits): Finding[] {
  const { noiseFloorDbfsSine: floor, activityRangeDb: range, activeLevelDbfsSine: level } = m;
  if (floor === null || range === null || level === null || m.durationSeconds < 2) return [];
  if (m.crestDb !== null && m.crestDb < CREST_OF_A_TONE_DB) return [];
  if (floor < level - FLOOR_BELOW_LEVEL_DB) return [];
  // A range this small under a very low floor is a quiet clip, which "low" says already.
  if (range < limits.activityRangeCareDb && floor > LOWEST_NOISY_FLOOR_DBFS)
    return [
      { code: 'noisy', severity: 'care', value: range, unit: 'dB', threshold: limits.activityRangeCareDb },
    ];
  if (floor <= limits.noiseFloorCareDbfs || range >= RANGE_THAT_EXCUSES_DB) return [];
  return [
    { code: 'noisy', severity: 'care', value: floor, unit: 'dBFS', threshold: limits.noiseFloorCareDbfs },
  ];
}

function contact(m: Measures, limits: JudgingLimits): Finding[] {
  const severity = above(m.handlingShare, limits.handlingCareShare, limits.handlingRepeatShare);
  const [first, last] = [m.handling[0], m.handling.at(-1)];
  if (!severity || !first || !last) return [];
  return [
    {
      code: 'handling',
      severity,
      value: m.handlingShare,
      unit: 'fraction',
      threshold: severity === 'repeat' ? limits.handlingRepeatShare : limits.handlingCareShare,
      from: first.startSeconds,
      to: last.startSeconds + last.durationSeconds,
    },
  ];
}

const WEIGHT: Record<Severity, number> = { note: 0, care: 1, repeat: 2 };

function ofTheChannels(m: Measures, facts: JudgingFacts, limits: JudgingLimits): Finding[] {
  const found: Finding[] = [];
  if (facts.identicalChannels) return [{ code: 'channels-identical', severity: 'note' }];
  for (const channel of facts.deadChannels) found.push({ code: 'channel-dead', severity: 'care', channel });
  const main = ofOneChannel(m, m, limits, []);
  m.perChannel?.forEach((other, channel) => {
    if (channel === facts.mainChannel || facts.deadChannels.includes(channel)) return;
    for (const finding of ofOneChannel(other, m, limits, [])) {
      const same = main.find(({ code }) => code === finding.code);
      if (!same || WEIGHT[finding.severity] > WEIGHT[same.severity]) found.push({ ...finding, channel });
    }
  });
  return found;
}
