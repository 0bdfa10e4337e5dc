import type { Finding, FindingCode, Measures } from './types';

type Placed = Pick<Measures, 'durationSeconds' | 'dropouts' | 'spikes' | 'handling' | 'sampleRateHz'>;

/** Findings that are of the whole clip: with one of them no part of it is clean. */
const WHOLE: readonly FindingCode[] = [
  'silent',
  'flat-topped',
  'hum',
  'noisy',
  'level-low',
  'dc-offset',
  'rate-unexpected',
  'lossy',
  'bandwidth-limited',
];

/**
 * Longest stretch without a care or repeat finding.
 *
 * @param clippedSpans seconds
 * @returns seconds from the start; null when a finding is of the whole clip, or nothing is left
 */
export function cleanStretch(
  measures: Placed,
  clippedSpans: readonly (readonly [number, number])[],
  findings: readonly Finding[],
): { from: number; to: number } | null {
  const weighty = new Set(findings.filter(({ severity }) => severity !== 'note').map(({ code }) => code));
  if (WHOLE.some((code) => weighty.has(code))) return null;
  const { dropouts, spikes, handling, durationSeconds, sampleRateHz } = measures;
  const bad: (readonly [number, number])[] = [
    ...dropouts.map(
      (hole) => [hole.startSeconds, hole.startSeconds + hole.lengthSamples / sampleRateHz] as const,
    ),
    ...spikes.map((click) => [click.startSeconds, click.startSeconds] as const),
    ...(weighty.has('handling')
      ? handling.map((burst) => [burst.startSeconds, burst.startSeconds + burst.durationSeconds] as const)
      : []),
    ...(weighty.has('clipped') ? clippedSpans : []),
  ].sort((a, b) => a[0] - b[0]);
  let best = { from: 0, to: 0 };
  let at = 0;
  for (const [from, to] of [...bad, [durationSeconds, durationSeconds] as const]) {
    if (from - at > best.to - best.from) best = { from: at, to: from };
    at = Math.max(at, to);
  }
  return best.to > best.from ? best : null;
}
