import Link from 'next/link';
import type { ButtonHTMLAttributes, ReactNode } from 'react';
import { cx } from './cx';

const chipClass = (on: boolean, more?: string) =>
  cx(
    'inline-flex items-center gap-1.5 rounded-full border px-3 py-[7px] text-13 leading-[1.2] whitespace-nowrap no-underline transition-colors',
    on
      ? 'border-spruce bg-spruce-wash font-semibold text-spruce'
      : 'border-line-control bg-transparent font-medium text-ink hover:border-ink',
    more,
  );

type ChipProps =
  | { href: string; current: boolean; children: ReactNode; className?: string }
  | (Omit<ButtonHTMLAttributes<HTMLButtonElement>, 'aria-pressed'> & { pressed: boolean; href?: undefined });

/** One filter or one way of listening: a link when it changes the address, a toggle when it changes the page. */
export function Chip(props: ChipProps) {
  if (props.href !== undefined) {
    return (
      <Link
        href={props.href}
        aria-current={props.current ? 'true' : undefined}
        scroll={false}
        className={chipClass(props.current, props.className)}
      >
        {props.children}
      </Link>
    );
  }
  const { pressed, className, ...rest } = props;
  return <button type="button" {...rest} aria-pressed={pressed} className={chipClass(pressed, className)} />;
}

/** The row of filters above a table. */
export function Filters({ label = 'Filters', children }: { label?: string; children: ReactNode }) {
  return (
    // biome-ignore lint/a11y/useSemanticElements: a fieldset would want a form; these are links and toggles
    <div role="group" aria-label={label} className="mb-3 flex flex-wrap items-center gap-2">
      {children}
    </div>
  );
}
