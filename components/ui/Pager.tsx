import Link from 'next/link';
import type { ReactNode } from 'react';

export interface PagerProps {
  /** "1 to 15 of 212", or what is known. */
  children?: ReactNode;
  newerHref?: string | null;
  olderHref?: string | null;
  newerLabel?: string;
  olderLabel?: string;
  /** Export, columns: at the right end. */
  more?: ReactNode;
}

/** Under a table: where one is, and the way to newer and older rows. */
export function Pager({
  children,
  newerHref,
  olderHref,
  newerLabel = 'Newer',
  olderLabel = 'Older',
  more,
}: PagerProps) {
  return (
    <div className="no-print flex flex-wrap items-center justify-between gap-x-4 gap-y-2 py-3 text-13 text-ink-soft">
      <span>{children}</span>
      <div className="flex flex-wrap items-center gap-x-4 gap-y-2">
        {newerHref || olderHref ? (
          <nav aria-label="Pages" className="flex gap-4">
            <PageLink href={newerHref} label={newerLabel} rel="prev" />
            <PageLink href={olderHref} label={olderLabel} rel="next" />
          </nav>
        ) : null}
        {more}
      </div>
    </div>
  );
}

function PageLink({ href, label, rel }: { href?: string | null; label: string; rel: string }) {
  if (!href) return <span aria-hidden="true">{label}</span>;
  return (
    <Link href={href} rel={rel} className="link">
      {label}
    </Link>
  );
}
