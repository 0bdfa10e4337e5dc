import { cx } from '@/components/ui/cx';
import type { Severity, Verdict } from '@/lib/acoustics/types';

export const VERDICT_WORDS: Record<Verdict, string> = {
  usable: 'Usable',
  care: 'Use with care',
  repeat: 'Record again',
};
const COLOURS: Record<Verdict, string> = { usable: 'text-spruce', care: 'text-brass', repeat: 'text-rust' };

export interface VerdictMarkProps {
  verdict: Verdict;
  /** `large` is the verdict of the bedside, legible at arm's length. */
  size?: 'small' | 'large';
  /** Other words beside the shape, such as a finding's title. */
  children?: string;
}

/** A verdict: a word and a shape, never colour alone. */
export function VerdictMark({ verdict, size = 'small', children }: VerdictMarkProps) {
  const large = size === 'large';
  return (
    <span
      className={cx(
        'inline-flex items-center font-semibold',
        COLOURS[verdict],
        large ? 'gap-3 font-plate text-28 min-[641px]:text-40' : 'gap-[7px] whitespace-nowrap',
      )}
    >
      <VerdictShape verdict={verdict} className={large ? 'size-[0.95em]' : 'size-3.5'} />
      {children ?? VERDICT_WORDS[verdict]}
    </span>
  );
}

/** A filled dot, a half-filled one, a ring with a gap. */
export function VerdictShape({ verdict, className }: { verdict: Verdict; className?: string }) {
  return (
    <svg aria-hidden="true" viewBox="0 0 16 16" className={cx('flex-none', className)}>
      {verdict === 'usable' ? <circle cx="8" cy="8" r="7" fill="currentColor" /> : null}
      {verdict === 'care' ? (
        <>
          <circle cx="8" cy="8" r="6.2" fill="none" stroke="currentColor" strokeWidth="1.6" />
          <path d="M8 1.8a6.2 6.2 0 0 0 0 12.4z" fill="currentColor" />
        </>
      ) : null}
      {verdict === 'repeat' ? (
        <path d="M8 1.8A6.2 6.2 0 1 0 14.2 8" fill="none" stroke="currentColor" strokeWidth="2.2" />
      ) : null}
    </svg>
  );
}

/** The shape that goes with a finding's severity; a note has none. */
export const verdictOfSeverity = (severity: Severity): Verdict | null =>
  severity === 'note' ? null : severity;
