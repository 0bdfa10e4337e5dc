import type { ReactNode } from 'react';
import { cx } from './cx';

export type NoticeTone = 'info' | 'good' | 'care' | 'alarm';

const TONES: Record<NoticeTone, { box: string; word: string; shape: ReactNode }> = {
  info: {
    box: 'border-slate bg-slate-wash',
    word: 'text-slate',
    shape: <path d="M8 2.5v.01M8 7v6.5" stroke="currentColor" strokeWidth="3" strokeLinecap="round" />,
  },
  good: {
    box: 'border-spruce bg-spruce-wash',
    word: 'text-spruce',
    shape: <circle cx="8" cy="8" r="6" fill="currentColor" />,
  },
  care: {
    box: 'border-brass bg-brass-wash',
    word: 'text-brass',
    shape: (
      <>
        <circle cx="8" cy="8" r="6" fill="none" stroke="currentColor" strokeWidth="2" />
        <path d="M8 2a6 6 0 0 0 0 12z" fill="currentColor" />
      </>
    ),
  },
  alarm: {
    box: 'border-rust bg-rust-wash',
    word: 'text-rust',
    shape: (
      <path d="M8 1.5 15 14H1z" fill="none" stroke="currentColor" strokeWidth="2" strokeLinejoin="round" />
    ),
  },
};

export interface NoticeProps {
  tone?: NoticeTone;
  /** The word that carries the tone, so that colour never does alone. */
  title?: ReactNode;
  children?: ReactNode;
  /** A button or a link: the next step. */
  action?: ReactNode;
  /** Announce it when it turns up. */
  live?: boolean;
  className?: string;
}

/** A note that stands in the page. `alarm` and `live` ones are announced. */
export function Notice({
  tone = 'info',
  title,
  children,
  action,
  live = tone === 'alarm',
  className,
}: NoticeProps) {
  const { box, word, shape } = TONES[tone];
  return (
    <div
      role={live ? (tone === 'alarm' ? 'alert' : 'status') : undefined}
      className={cx(
        'flex flex-wrap items-start gap-x-3 gap-y-2 rounded-plate border-l-[6px] px-4 py-3',
        box,
        className,
      )}
    >
      <svg aria-hidden="true" viewBox="0 0 16 16" className={cx('mt-[3px] size-4 flex-none', word)}>
        {shape}
      </svg>
      <div className="min-w-0 max-w-line flex-1">
        {title ? <p className={cx('font-semibold', word)}>{title}</p> : null}
        {children ? <div>{children}</div> : null}
      </div>
      {action ? <div className="flex-none self-center">{action}</div> : null}
    </div>
  );
}
