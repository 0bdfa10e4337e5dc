/** A stretch of a recording, in seconds from its start. */
export interface Stretch {
  from: number;
  to: number;
}

/** What of a recording is on screen is never shorter than this. */
export const SHORTEST_VIEW_SECONDS = 0.05;

export const clamp = (value: number, low: number, high: number): number =>
  Math.min(high, Math.max(low, value));

/** The view moved and sized so that it lies within the recording. */
export function fitView(view: Stretch, durationSeconds: number): Stretch {
  const length = clamp(
    view.to - view.from,
    Math.min(SHORTEST_VIEW_SECONDS, durationSeconds),
    durationSeconds,
  );
  const from = clamp(view.from, 0, durationSeconds - length);
  return { from, to: from + length };
}

/** The view made shorter (factor below 1) or longer about a point that stays where it is on screen. */
export function zoomAbout(
  view: Stretch,
  aboutSeconds: number,
  factor: number,
  durationSeconds: number,
): Stretch {
  const length = clamp((view.to - view.from) * factor, SHORTEST_VIEW_SECONDS, durationSeconds);
  const share = (aboutSeconds - view.from) / (view.to - view.from);
  const from = aboutSeconds - share * length;
  return fitView({ from, to: from + length }, durationSeconds);
}

/** The view moved so that a point is in it, and no further than needed. */
export function viewWith(view: Stretch, seconds: number, durationSeconds: number): Stretch {
  const length = view.to - view.from;
  if (seconds < view.from) return fitView({ from: seconds, to: seconds + length }, durationSeconds);
  if (seconds > view.to) return fitView({ from: seconds - length, to: seconds }, durationSeconds);
  return view;
}

/** Round values of 1, 2 or 5 times a power of ten within a stretch, about `wanted` of them. */
export function ticksOf(from: number, to: number, wanted: number): { values: number[]; digits: number } {
  const raw = (to - from) / Math.max(1, wanted);
  if (!(raw > 0) || !Number.isFinite(raw)) return { values: [], digits: 0 };
  const power = 10 ** Math.floor(Math.log10(raw));
  const step =
    [1, 2, 5, 10].map((n) => n * power).find((candidate) => candidate >= raw * 0.999) ?? 10 * power;
  const digits = Math.max(0, -Math.floor(Math.log10(step) + 1e-9));
  const values: number[] = [];
  for (let n = Math.ceil(from / step - 1e-9) + 0; n * step <= to + step * 1e-9; n++) values.push(n * step);
  return { values, digits };
}

/** "6.10 to 8.35 s" */
export const stretchInWords = ({ from, to }: Stretch): string => `${from.toFixed(2)} to ${to.toFixed(2)} s`;

/**
 * In which lane each label goes so that none covers another; null where there is no room left for a label.
 *
 * @param labels left edge and width in pixels, in order of their left edges
 */
export function lanesOf(
  labels: readonly { left: number; width: number }[],
  lanes: number,
): (number | null)[] {
  const ends = Array.from({ length: lanes }, () => Number.NEGATIVE_INFINITY);
  return labels.map(({ left, width }) => {
    const lane = ends.findIndex((end) => end + 4 <= left);
    if (lane < 0) return null;
    ends[lane] = left + width;
    return lane;
  });
}
