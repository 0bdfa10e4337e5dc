import { type ReactNode, useId } from 'react';
import { cx } from './cx';

export interface PanelProps {
  title?: ReactNode;
  /** At the right of the title: a count, a state, a small button. */
  aside?: ReactNode;
  /** Without inner space, for a table or a list that runs edge to edge. */
  flush?: boolean;
  className?: string;
  children: ReactNode;
}

/** A raised sheet with a hairline. Never put one inside another. */
export function Panel({ title, aside, flush = false, className, children }: PanelProps) {
  const id = useId();
  return (
    <section
      aria-labelledby={title ? id : undefined}
      className={cx('min-w-0 rounded-plate border border-line bg-sheet', className)}
    >
      {title ? (
        <header className="flex items-center justify-between gap-3 border-b border-line px-[18px] py-3.5">
          <h2 id={id}>{title}</h2>
          {aside}
        </header>
      ) : null}
      <div className={flush ? undefined : 'px-[18px] py-4'}>{children}</div>
    </section>
  );
}

/** A part of a page without a box: title, hairline under it when another follows. */
export function Section({ title, aside, className, children }: Omit<PanelProps, 'flush'>) {
  const id = useId();
  return (
    <section aria-labelledby={title ? id : undefined} className={cx('min-w-0', className)}>
      {title ? (
        <header className="mb-2.5 flex flex-wrap items-end justify-between gap-3">
          <h2 id={id}>{title}</h2>
          {aside}
        </header>
      ) : null}
      {children}
    </section>
  );
}
