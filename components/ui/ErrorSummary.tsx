'use client';

import { useEffect, useRef } from 'react';

export interface FieldError {
  /** Id of the control, as given to its Field. */
  id: string;
  message: string;
}

/** What is wrong with a form, on top of it, each line a link to its field. Takes focus when it turns up. */
export function ErrorSummary({ errors, title }: { errors: readonly FieldError[]; title?: string }) {
  const ref = useRef<HTMLDivElement>(null);
  useEffect(() => {
    if (errors.length > 0) ref.current?.focus();
  }, [errors]);
  if (errors.length === 0) return null;
  const heading =
    title ?? (errors.length === 1 ? 'One thing to put right' : `${errors.length} things to put right`);
  return (
    <div
      ref={ref}
      role="alert"
      tabIndex={-1}
      className="rounded-plate border-l-[6px] border-rust bg-rust-wash px-4 py-3"
    >
      <h2 className="text-rust">{heading}</h2>
      <ul className="mt-1 grid gap-1">
        {errors.map((error) => (
          <li key={`${error.id}-${error.message}`}>
            <a
              href={`#${error.id}`}
              onClick={(event) => {
                event.preventDefault();
                document.getElementById(error.id)?.focus();
              }}
            >
              {error.message}
            </a>
          </li>
        ))}
      </ul>
    </div>
  );
}
