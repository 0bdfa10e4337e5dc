import type { ReactNode } from 'react';
import { cx } from './cx';

export interface Fact {
  term: string;
  /** Left out when null, undefined or false. */
  value: ReactNode;
  key?: string;
}

/** Facts, term beside value. `stacked` puts the term above, for narrow columns with long values. */
export function DefinitionList({
  facts,
  stacked = false,
  className,
}: {
  facts: readonly Fact[];
  stacked?: boolean;
  className?: string;
}) {
  const shown = facts.filter(({ value }) => value !== null && value !== undefined && value !== false);
  return (
    <dl
      className={cx(
        'grid',
        stacked ? 'gap-y-3' : 'grid-cols-[max-content_minmax(0,1fr)] gap-x-4 gap-y-2',
        className,
      )}
    >
      {shown.map(({ term, value, key }) => (
        <div key={key ?? term} className={stacked ? 'grid gap-0.5' : 'contents'}>
          <dt className={cx('text-ink-soft', stacked && 'text-13')}>{term}</dt>
          <dd className="min-w-0 break-words">{value}</dd>
        </div>
      ))}
    </dl>
  );
}
