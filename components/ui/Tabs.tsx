'use client';

import Link from 'next/link';
import { usePathname } from 'next/navigation';
import type { ReactNode } from 'react';
import { cx } from './cx';

export interface Tab {
  href: string;
  label: ReactNode;
  /** How many wait there; left out when zero. */
  count?: number;
  /** Set it where the address does not tell (a search parameter). */
  current?: boolean;
}

/** Pages side by side, as links. The longest address that the current one begins with is current. */
export function Tabs({ tabs, label }: { tabs: readonly Tab[]; label: string }) {
  const pathname = usePathname();
  const told = tabs.some((tab) => tab.current !== undefined);
  const current = tabs
    .filter(({ href }) => pathname === href || pathname.startsWith(`${href}/`))
    .sort((a, b) => b.href.length - a.href.length)[0];
  return (
    <nav aria-label={label} className="no-print mb-6 overflow-x-auto border-b border-line">
      <ul className="flex gap-1">
        {tabs.map((tab) => {
          const on = told ? tab.current === true : tab === current;
          return (
            <li key={tab.href}>
              <Link
                href={tab.href}
                aria-current={on ? 'page' : undefined}
                className={cx(
                  '-mb-px block border-b-[3px] px-3 py-2.5 whitespace-nowrap -outline-offset-2',
                  on
                    ? 'border-brass font-semibold text-brass'
                    : 'border-transparent text-ink hover:border-line-strong',
                )}
              >
                {tab.label}
                {tab.count ? <span className="text-ink-soft"> {tab.count}</span> : null}
              </Link>
            </li>
          );
        })}
      </ul>
    </nav>
  );
}
