import { DefinitionList, type Fact } from '@/components/ui/DefinitionList';
import type { Measures, Rate } from '@/lib/acoustics/types';
import { figure, percentage } from './figures';

export interface MeasuresListProps {
  /** As stored; of an older version some may be missing, and are left out. */
  measures: Partial<Measures>;
  /** Rates the model should send, Hz: says whether this one does. */
  expectedSampleRatesHz?: readonly number[];
}

const NOT_SURE = <span className="text-ink-soft">not sure enough to say</span>;

/** What was measured, for people who know what it means. Levels: 0 dBFS is the RMS of a full-scale sine (AES17). */
export function MeasuresList({ measures, expectedSampleRatesHz = [] }: MeasuresListProps) {
  return (
    <DefinitionList
      facts={[
        ...formatFacts(measures, expectedSampleRatesHz),
        ...levelFacts(measures),
        ...bodyFacts(measures),
      ]}
    />
  );
}

const decibels = (value: number | null | undefined, unit: string): string | null =>
  value === undefined ? null : value === null ? 'digital silence' : `${figure(value, 1)} ${unit}`;

function formatFacts(m: Partial<Measures>, expected: readonly number[]): Fact[] {
  const rate = m.sampleRateHz;
  const fits =
    rate === undefined || expected.length === 0
      ? ''
      : expected.includes(rate)
        ? ', as the model says'
        : ', not what the model says';
  return [
    { term: 'Sample rate', value: rate === undefined ? null : `${figure(rate)} Hz${fits}` },
    {
      term: 'Format',
      value: m.encoding
        ? `${m.container ?? ''} ${m.encoding}${m.bitDepth ? `, ${m.bitDepth} bit` : ''}`.trim()
        : null,
    },
    { term: 'Channels', value: m.channels === undefined || m.channels === 1 ? null : m.channels },
    { term: 'Length', value: m.durationSeconds === undefined ? null : `${figure(m.durationSeconds, 2)} s` },
  ];
}

function levelFacts(m: Partial<Measures>): Fact[] {
  return [
    { term: 'Level', value: decibels(m.rmsDbfsSine, 'dBFS (sine)') },
    { term: 'Peak', value: decibels(m.peakDbfs, 'dBFS') },
    { term: 'Noise floor', value: decibels(m.noiseFloorDbfsSine, 'dBFS (sine)') },
    {
      term: 'Activity range',
      value: typeof m.activityRangeDb === 'number' ? `${figure(m.activityRangeDb, 1)} dB` : null,
    },
    {
      term: 'Clipped',
      value: m.clippedFraction
        ? `${percentage(m.clippedFraction)}, longest ${m.clippedLongestRunSamples ?? 0} samples`
        : null,
    },
    { term: 'DC', value: m.dcFraction === undefined ? null : percentage(m.dcFraction) },
    { term: 'Bandwidth', value: typeof m.bandwidthHz === 'number' ? `${figure(m.bandwidthHz)} Hz` : null },
    {
      term: 'Mains hum',
      value: m.hum
        ? `${figure(m.hum.frequencyHz, 1)} Hz, ${figure(m.hum.relativeDb, 1)} dB against the breath band`
        : null,
    },
  ];
}

function bodyFacts(m: Partial<Measures>): Fact[] {
  return [
    { term: 'Breaths', value: rateInWords(m.breathRate) },
    { term: 'Heart', value: rateInWords(m.heartRate) },
    {
      term: 'Clean stretch',
      value: m.cleanStretch ? `${figure(m.cleanStretch.from, 1)} to ${figure(m.cleanStretch.to, 1)} s` : null,
    },
  ];
}

const rateInWords = (rate: Rate | null | undefined) =>
  rate === undefined
    ? null
    : rate === null
      ? NOT_SURE
      : `${figure(rate.perMinute)} a minute, confidence ${rate.confidence.toFixed(2)}`;
