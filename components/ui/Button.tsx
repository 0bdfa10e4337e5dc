import Link from 'next/link';
import type { ButtonHTMLAttributes, ComponentProps, ReactNode } from 'react';
import { cx } from './cx';

export type ButtonVariant = 'primary' | 'plain' | 'danger' | 'quiet' | 'bar';
export type ButtonSize = 'normal' | 'small' | 'large';

const VARIANTS: Record<ButtonVariant, string> = {
  primary: 'border-spruce bg-spruce text-on-spruce enabled:hover:brightness-110',
  plain: 'border-line-control bg-sheet text-ink enabled:hover:border-ink',
  danger: 'border-rust bg-sheet text-rust enabled:hover:bg-rust-wash',
  quiet: 'border-transparent bg-transparent text-spruce enabled:hover:underline underline-offset-3',
  bar: 'border-current bg-transparent text-inherit enabled:hover:underline underline-offset-3',
};
const SIZES: Record<ButtonSize, string> = {
  small: 'px-3 py-[7px] text-13',
  normal: 'px-4 py-[11px] text-15',
  large: 'min-h-[52px] px-5 py-[14px] text-17',
};

export const buttonClass = (
  variant: ButtonVariant = 'plain',
  size: ButtonSize = 'normal',
  more?: string,
): string =>
  cx(
    'inline-flex items-center justify-center gap-2 rounded-plate border font-semibold leading-none whitespace-nowrap no-underline transition-colors select-none disabled:opacity-55 disabled:cursor-not-allowed aria-disabled:cursor-progress',
    VARIANTS[variant],
    SIZES[size],
    more,
  );

export interface ButtonProps extends ButtonHTMLAttributes<HTMLButtonElement> {
  variant?: ButtonVariant;
  size?: ButtonSize;
  /** Work is under way: the button stays where focus is, says so, and takes no second press. */
  busy?: boolean;
  busyLabel?: string;
}

export function Button({
  variant,
  size,
  busy = false,
  busyLabel,
  className,
  children,
  onClick,
  ...rest
}: ButtonProps) {
  return (
    <button
      type="button"
      {...rest}
      aria-disabled={busy || undefined}
      aria-busy={busy || undefined}
      onClick={busy ? (event) => event.preventDefault() : onClick}
      className={buttonClass(variant, size, className)}
    >
      {busy ? <Spinner /> : null}
      {busy && busyLabel ? busyLabel : children}
    </button>
  );
}

type ButtonLinkProps = Omit<ComponentProps<typeof Link>, 'className'> & {
  variant?: ButtonVariant;
  size?: ButtonSize;
  className?: string;
  children: ReactNode;
};

export function ButtonLink({ variant, size, className, ...rest }: ButtonLinkProps) {
  return <Link {...rest} className={buttonClass(variant, size, className)} />;
}

function Spinner() {
  return (
    <svg aria-hidden="true" viewBox="0 0 16 16" className="size-[1em] animate-breathe">
      <path
        d="M8 2a6 6 0 1 0 6 6"
        fill="none"
        stroke="currentColor"
        strokeWidth="2.5"
        strokeLinecap="round"
      />
    </svg>
  );
}
