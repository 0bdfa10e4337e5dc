import type { DecodeResult } from './decode/types';
import type { Finding, JudgingLimits, Measures, Severity, Verdict } from './types';

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

/** A floor that stands this far below the sound does no harm, however high it is. */
const RANGE_THAT_EXCUSES_DB = 15;
/** A tone has a crest factor near 3 dB: a steady one has no floor to speak of. */
const CREST_OF_A_TONE_DB = 4;
const SHORTEST_FOR_DC_SECONDS = 2;

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
  clippedFrom: number | null;
  clippedTo: number | null;
}

/** The worst severity decides; a score would hide a fatal fault. */
export function verdictOf(findings: readonly Finding[]): Verdict {
  if (findings.some((finding) => finding.severity === 'repeat')) return 'repeat';
  return findings.some((finding) => finding.severity === 'care') ? 'care' : 'usable';
}

const above = (value: number, care: number, repeat: number): Severity | null =>
  value > repeat ? 'repeat' : value > care ? 'care' : null;

/**
 * Findings out of measures and facts, by the limits. One finding a code, from its first place to its last. Pure, so
 * that a changed policy can be tried on what is stored.
 */
export function judge(measures: Measures | null, facts: JudgingFacts, limits: JudgingLimits): Finding[] {
  if (facts.failure === 'empty') return [{ code: 'empty', severity: 'repeat' }];
  if (facts.failure === 'unreadable' || !measures) return [{ code: 'unreadable', severity: 'repeat' }];
  const findings: Finding[] = [...ofTheFile(measures, facts, limits), ...ofTheRate(measures, limits)];
  const silent = isSilent(measures, facts, limits);
  if (silent)
    findings.push({
      code: 'silent',
      severity: 'repeat',
      ...(measures.activeLevelDbfsSine === null ? {} : { value: measures.activeLevelDbfsSine, unit: 'dBFS' }),
      threshold: limits.silentDbfs,
    });
  findings.push(...ofTheRails(measures, facts, limits), ...ofHoles(measures, limits));
  if (!silent) findings.push(...ofTheSound(measures, limits));
  findings.push(...ofTheChannels(facts));
  return findings;
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
  if (short)
    found.push({
      code: 'too-short',
      severity: 'repeat',
      value: m.durationSeconds,
      unit: 's',
      threshold: limits.minimumSeconds,
    });
  else if (m.durationSeconds < limits.minimumSecondsForRates) {
    found.push({
      code: 'too-short-for-rates',
      severity: 'note',
      value: m.durationSeconds,
      unit: 's',
      threshold: limits.minimumSecondsForRates,
    });
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
  if (m.bandwidthHz !== null && (m.brickWall || m.upsampled)) {
    found.push({
      code: 'bandwidth-limited',
      severity: m.bandwidthHz < limits.bandwidthCareHz ? 'care' : 'note',
      value: m.bandwidthHz,
      unit: 'Hz',
      threshold: limits.bandwidthCareHz,
    });
  }
  const odd = [
    m.breathRate && (m.breathRate.perMinute < 6 || m.breathRate.perMinute > 50) ? m.breathRate : null,
    m.heartRate && (m.heartRate.perMinute < 42 || m.heartRate.perMinute > 185) ? m.heartRate : null,
  ].find((rate) => rate !== null);
  if (odd && odd.confidence >= 0.6)
    found.push({ code: 'implausible-rates', severity: 'note', value: odd.perMinute, unit: '/min' });
  return found;
}

const isSilent = (m: Measures, facts: JudgingFacts, limits: JudgingLimits): boolean =>
  m.peakDbfs === null ||
  facts.distinctCodes < 4 ||
  m.activeLevelDbfsSine === null ||
  m.activeLevelDbfsSine < limits.silentDbfs;

function ofTheRails(m: Measures, facts: JudgingFacts, limits: JudgingLimits): Finding[] {
  const found: Finding[] = [];
  const clipped = above(m.clippedFraction, limits.clippedCareFraction, limits.clippedRepeatFraction);
  if (clipped && facts.distinctCodes >= 4) {
    found.push({
      code: 'clipped',
      severity: clipped,
      value: m.clippedFraction,
      unit: 'fraction',
      threshold: clipped === 'repeat' ? limits.clippedRepeatFraction : limits.clippedCareFraction,
      ...(facts.clippedFrom === null || facts.clippedTo === null
        ? {}
        : { from: facts.clippedFrom / m.sampleRateHz, to: facts.clippedTo / m.sampleRateHz }),
    });
  }
  if (m.flatTop) found.push({ code: 'flat-topped', severity: 'care', value: m.flatTop.dbfs, unit: 'dBFS' });
  if (facts.overFullScale > 0)
    found.push({ code: 'over-full-scale', severity: 'note', value: facts.overFullScale, unit: 'samples' });
  const dc =
    m.durationSeconds >= SHORTEST_FOR_DC_SECONDS
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
  return found;
}

function ofHoles(m: Measures, limits: JudgingLimits): Finding[] {
  const found: Finding[] = [];
  const first = m.dropouts[0];
  const last = m.dropouts.at(-1);
  if (first && last) {
    const seconds = m.dropouts.reduce((sum, hole) => sum + hole.lengthSamples, 0) / m.sampleRateHz;
    const repeat =
      seconds > limits.dropoutRepeatSeconds || seconds > limits.dropoutRepeatFraction * m.durationSeconds;
    found.push({
      code: 'dropout',
      severity: repeat ? 'repeat' : 'care',
      value: seconds,
      unit: 's',
      threshold: limits.dropoutRepeatSeconds,
      from: first.startSeconds,
      to: last.startSeconds + last.lengthSamples / m.sampleRateHz,
    });
  }
  const click = m.spikes[0];
  if (click)
    found.push({
      code: 'spikes',
      severity: 'care',
      value: m.spikes.length,
      unit: 'count',
      from: click.startSeconds,
      to: m.spikes.at(-1)?.startSeconds ?? click.startSeconds,
    });
  return found;
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
    const severity: Severity =
      m.hum.relativeDb > limits.humRepeatDb
        ? 'repeat'
        : m.hum.relativeDb >= limits.humNoteDb
          ? 'care'
          : 'note';
    found.push({
      code: 'hum',
      severity,
      value: m.hum.relativeDb,
      unit: 'dB',
      threshold: severity === 'repeat' ? limits.humRepeatDb : limits.humNoteDb,
    });
  }
  if (isNoisy(m, limits)) {
    const floorIsIt = (m.activityRangeDb ?? 0) >= limits.activityRangeCareDb;
    found.push(
      floorIsIt
        ? {
            code: 'noisy',
            severity: 'care',
            value: m.noiseFloorDbfsSine ?? 0,
            unit: 'dBFS',
            threshold: limits.noiseFloorCareDbfs,
          }
        : {
            code: 'noisy',
            severity: 'care',
            value: m.activityRangeDb ?? 0,
            unit: 'dB',
            threshold: limits.activityRangeCareDb,
          },
    );
  }
  const handled = above(m.handlingShare, limits.handlingCareShare, limits.handlingRepeatShare);
  const first = m.handling[0];
  const last = m.handling.at(-1);
  if (handled && first && last) {
    found.push({
      code: 'handling',
      severity: handled,
      value: m.handlingShare,
      unit: 'fraction',
      threshold: handled === 'repeat' ? limits.handlingRepeatShare : limits.handlingCareShare,
      from: first.startSeconds,
      to: last.startSeconds + last.durationSeconds,
    });
  }
  return found;
}

function isNoisy(m: Measures, limits: JudgingLimits): boolean {
  if (m.noiseFloorDbfsSine === null || m.activityRangeDb === null || m.durationSeconds < 2) return false;
  if (m.crestDb !== null && m.crestDb < CREST_OF_A_TONE_DB) return false;
  // A range this small under a very low floor is a quiet clip, which "low" says already.
  if (m.activityRangeDb < limits.activityRangeCareDb) return m.noiseFloorDbfsSine > -70;
  return m.noiseFloorDbfsSine > limits.noiseFloorCareDbfs && m.activityRangeDb < RANGE_THAT_EXCUSES_DB;
}

function ofTheChannels(facts: JudgingFacts): Finding[] {
  const found: Finding[] = [];
  if (facts.identicalChannels) found.push({ code: 'channels-identical', severity: 'note' });
  for (const channel of facts.deadChannels) found.push({ code: 'channel-dead', severity: 'care', channel });
  return found;
}

/** Longest stretch without a care or repeat finding that has a place, seconds; null when a finding spans the clip. */
export function cleanStretch(
  m: Pick<Measures, 'durationSeconds' | 'dropouts' | 'spikes' | 'handling' | 'sampleRateHz'>,
  findings: readonly Finding[],
): { from: number; to: number } | null {
  const has = (code: Finding['code']) =>
    findings.some((finding) => finding.code === code && finding.severity !== 'note');
  const clipped = findings.find((finding) => finding.code === 'clipped');
  const whole = [
    'silent',
    'flat-topped',
    'hum',
    'noisy',
    'level-low',
    'dc-offset',
    'rate-unexpected',
    'lossy',
    'bandwidth-limited',
  ] as const;
  if (whole.some(has)) return null;
  const bad: [number, number][] = [
    ...m.dropouts.map((hole): [number, number] => [
      hole.startSeconds,
      hole.startSeconds + hole.lengthSamples / m.sampleRateHz,
    ]),
    ...m.spikes.map((click): [number, number] => [click.startSeconds, click.startSeconds]),
    ...(has('handling')
      ? m.handling.map((burst): [number, number] => [
          burst.startSeconds,
          burst.startSeconds + burst.durationSeconds,
        ])
      : []),
    ...(clipped?.from === undefined || clipped.to === undefined
      ? []
      : [[clipped.from, clipped.to] as [number, number]]),
  ].sort((a, b) => a[0] - b[0]);
  let best = { from: 0, to: 0 };
  let at = 0;
  for (const [from, to] of [...bad, [m.durationSeconds, m.durationSeconds] as [number, number]]) {
    if (from - at > best.to - best.from) best = { from: at, to: from };
    at = Math.max(at, to);
  }
  return best.to > best.from ? best : null;
}
