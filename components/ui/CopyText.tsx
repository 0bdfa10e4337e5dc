'use client';

import { useRef, useState } from 'react';
import { cx } from './cx';

export interface CopyTextProps {
  text: string;
  /** What it is, for the button's name: "token", "thumbprint". */
  what: string;
  /** Show less than is copied (`9f2c…e41a`). */
  shown?: string;
  className?: string;
}

/** Something that is read aloud or pasted elsewhere: mono, with a button that copies all of it. */
export function CopyText({ text, what, shown, className }: CopyTextProps) {
  const [state, setState] = useState<'idle' | 'done' | 'failed'>('idle');
  const timer = useRef<ReturnType<typeof setTimeout>>(undefined);
  const copy = async () => {
    clearTimeout(timer.current);
    try {
      await navigator.clipboard.writeText(text);
      setState('done');
    } catch {
      // Without a secure context there is no clipboard: the text itself can still be selected.
      setState('failed');
    }
    timer.current = setTimeout(() => setState('idle'), 2500);
  };
  return (
    <span className={cx('inline-flex max-w-full flex-wrap items-baseline gap-x-2', className)}>
      <span className="mono min-w-0 break-all select-all" title={shown ? text : undefined}>
        {shown ?? text}
      </span>
      <button
        type="button"
        onClick={copy}
        className="no-print link min-h-6 text-13"
        aria-label={`Copy the ${what}`}
      >
        Copy
      </button>
      <span role="status" className="text-13 text-ink-soft">
        {state === 'done' ? 'copied' : state === 'failed' ? 'select it and copy by hand' : ''}
      </span>
    </span>
  );
}
