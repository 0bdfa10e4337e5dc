import { cx } from './cx';

export type ProgressTone = 'spruce' | 'slate' | 'brass' | 'waiting' | 'stopped';

export interface ProgressPart {
  /** What this share is: "renewed and in use". Read out. */
  label: string;
  count: number;
  tone: ProgressTone;
}

const TONES: Record<ProgressTone, string> = {
  spruce: 'bg-spruce',
  slate: 'bg-slate',
  brass: 'bg-brass',
  waiting: 'bg-line-strong',
  stopped: 'bg-[repeating-linear-gradient(135deg,var(--color-rust)_0_3px,transparent_3px_6px)]',
};

export interface ProgressProps {
  /** What is under way, for screen readers. */
  label: string;
  total: number;
  /** The first part counts as done. */
  parts: readonly ProgressPart[];
  thin?: boolean;
  className?: string;
}

/** True progress: how many of how many, in parts. */
export function Progress({ label, total, parts, thin = false, className }: ProgressProps) {
  const words = parts.map((part) => `${part.count} ${part.label}`).join(', ');
  return (
    <div
      role="progressbar"
      aria-label={label}
      aria-valuemin={0}
      aria-valuemax={total}
      aria-valuenow={parts[0]?.count ?? 0}
      aria-valuetext={`${words}, of ${total}`}
      className={cx(
        'flex w-full overflow-hidden rounded-full bg-line forced-color-adjust-none [print-color-adjust:exact]',
        thin ? 'h-2' : 'h-3.5',
        className,
      )}
    >
      {parts.map((part) => (
        <span
          key={part.label}
          title={`${part.count} ${part.label}`}
          className={TONES[part.tone]}
          style={{ width: total > 0 ? `${(part.count / total) * 100}%` : 0 }}
        />
      ))}
    </div>
  );
}
