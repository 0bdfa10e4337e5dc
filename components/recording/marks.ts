import { findingSentence } from '@/lib/acoustics/sentences';
import type { Measures } from '@/lib/acoustics/types';
import type { ShownFinding } from './FindingsTable';
import { figure } from './figures';
import type { StageMark } from './stage/StageMarks';

/** Findings that have a place, and places to listen: what stands above the waveform. */
export function marksOf(
  findings: readonly ShownFinding[],
  measures: Pick<Partial<Measures>, 'tonal' | 'explosive'> | null,
): StageMark[] {
  const found = findings.flatMap((finding, index): StageMark[] =>
    finding.from === undefined || finding.to === undefined
      ? []
      : [
          {
            id: `finding-${index}`,
            label: findingSentence(finding).title.toLowerCase(),
            from: finding.from,
            to: finding.to,
            kind: finding.severity,
          },
        ],
  );
  const tones = (measures?.tonal ?? []).map(
    (tone, index): StageMark => ({
      id: `tone-${index}`,
      label: `tone ${figure(tone.frequencyHz)} Hz, ${figure(tone.durationSeconds, 2)} s`,
      from: tone.startSeconds,
      to: tone.startSeconds + tone.durationSeconds,
      kind: 'place',
    }),
  );
  const short = (measures?.explosive ?? []).map(
    (burst, index): StageMark => ({
      id: `burst-${index}`,
      label: 'short burst',
      from: burst.startSeconds,
      to: burst.startSeconds + (burst.twoCycleMs ?? 10) / 1000,
      kind: 'place',
    }),
  );
  return [...found, ...tones, ...short];
}

/** Tones and bursts of the measures that touch a stretch: what can be said of a selection. */
export function placesWithin(
  measures: Pick<Partial<Measures>, 'tonal' | 'explosive'> | null,
  stretch: { from: number; to: number },
) {
  const touches = (start: number, length: number) => start < stretch.to && start + length > stretch.from;
  return {
    tonal: (measures?.tonal ?? []).filter((tone) => touches(tone.startSeconds, tone.durationSeconds)),
    explosive: (measures?.explosive ?? []).filter((burst) => touches(burst.startSeconds, 0.01)),
  };
}
