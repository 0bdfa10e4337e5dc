'use client';

import { useClock } from './Clock';
import { relativeInWords, type TimeStyle, timeInWords, zoneInWords } from './timeWords';

export interface TimeProps {
  /** UTC milliseconds; null shows `never`. */
  at: number | null | undefined;
  /** `relative` in lists (exact on hover); else how exact. */
  mode?: 'relative' | TimeStyle;
  /** Say the zone after an exact time: on detail pages and in the Ledger. */
  withZone?: boolean;
  /** "3 min ago" instead of "3 min". */
  ago?: boolean;
  never?: string;
  className?: string;
}

/** One moment. Needs a Clock above it for relative words; without one it is exact, in UTC. */
export function Time({
  at,
  mode = 'relative',
  withZone = false,
  ago = false,
  never = 'never',
  className,
}: TimeProps) {
  const { now, zone } = useClock();
  if (at === null || at === undefined) return <span className={className ?? 'text-ink-soft'}>{never}</span>;
  const exact = `${timeInWords(at, 'second', zone)} ${zoneInWords(at, zone)}`;
  const relative = mode === 'relative' && now !== undefined;
  const words = relative
    ? relativeInWords(at, now, zone)
    : timeInWords(at, mode === 'relative' ? 'minute' : mode, zone, now);
  const past = relative && ago && at < now && /\d (s|min|h|d)$/.test(words);
  return (
    <time dateTime={new Date(at).toISOString()} title={exact} className={className}>
      {words}
      {past ? ' ago' : ''}
      {withZone && !relative ? ` ${zoneInWords(at, zone)}` : ''}
    </time>
  );
}
