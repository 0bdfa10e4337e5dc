'use client';

import { Dialog as Radix } from 'radix-ui';
import type { ReactNode } from 'react';
import { cx } from './cx';

export interface DialogProps {
  open: boolean;
  onOpenChange: (open: boolean) => void;
  title: string;
  /** One sentence under the title; read out with it. */
  description?: ReactNode;
  children: ReactNode;
  /** Buttons, right to left in weight: the act last. */
  footer?: ReactNode;
  wide?: boolean;
}

/** A modal: focus stays inside, Escape and the veil close it, focus goes back to where it came from. */
export function Dialog({
  open,
  onOpenChange,
  title,
  description,
  children,
  footer,
  wide = false,
}: DialogProps) {
  return (
    <Radix.Root open={open} onOpenChange={onOpenChange}>
      <Radix.Portal>
        <Radix.Overlay className="fixed inset-0 z-20 bg-veil" />
        <Radix.Content
          {...(description ? {} : { 'aria-describedby': undefined })}
          className={cx(
            'fixed top-1/2 left-1/2 z-30 grid max-h-[calc(100dvh-32px)] w-[calc(100vw-32px)] -translate-x-1/2 -translate-y-1/2 grid-rows-[auto_minmax(0,1fr)_auto] rounded-plate border border-line bg-sheet shadow-raised',
            wide ? 'max-w-[840px]' : 'max-w-[520px]',
          )}
        >
          <header className="px-6 pt-5 pb-3">
            <Radix.Title className="font-plate text-21 font-semibold">{title}</Radix.Title>
            {description ? (
              <Radix.Description className="mt-1.5 text-ink-soft">{description}</Radix.Description>
            ) : null}
          </header>
          <div className="overflow-y-auto px-6 pt-1 pb-5">{children}</div>
          {footer ? (
            <footer className="flex flex-wrap justify-end gap-3 border-t border-line px-6 py-4">
              {footer}
            </footer>
          ) : null}
        </Radix.Content>
      </Radix.Portal>
    </Radix.Root>
  );
}
