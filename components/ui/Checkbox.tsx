'use client';

import { type InputHTMLAttributes, type ReactNode, type Ref, useEffect, useId, useRef } from 'react';
import { cx } from './cx';

export interface CheckboxProps extends Omit<InputHTMLAttributes<HTMLInputElement>, 'type'> {
  label: ReactNode;
  help?: ReactNode;
  /** Keep the label for screen readers only, as in a table. */
  labelHidden?: boolean;
  /** Some, but not all. */
  mixed?: boolean;
  /** Draw a radio button instead; give the same `name` to all of a group inside a fieldset. */
  radio?: boolean;
}

export function Checkbox({
  label,
  help,
  labelHidden,
  mixed = false,
  radio,
  className,
  ...rest
}: CheckboxProps) {
  const ref = useMixed(mixed);
  const made = useId();
  const id = rest.id ?? made;
  const helpId = `${id}-help`;
  const box = (
    <input
      {...rest}
      id={id}
      ref={ref}
      type={radio ? 'radio' : 'checkbox'}
      aria-label={labelHidden && typeof label === 'string' ? label : undefined}
      aria-describedby={help ? helpId : undefined}
      className="size-[17px] flex-none"
    />
  );
  // In a table the whole cell is the target, so that it is not smaller than 24 px (WCAG 2.2, 2.5.8).
  if (labelHidden)
    return (
      <label htmlFor={id} className={cx('grid size-8 place-items-center', className)}>
        {box}
      </label>
    );
  return (
    <div className={cx('grid gap-0.5', className)}>
      <label htmlFor={id} className="flex min-h-8 items-center gap-2.5">
        {box}
        <span>{label}</span>
      </label>
      {help ? (
        <p id={helpId} className="ml-[27px] max-w-line text-13 text-ink-soft">
          {help}
        </p>
      ) : null}
    </div>
  );
}

function useMixed(mixed: boolean): Ref<HTMLInputElement> {
  const ref = useRef<HTMLInputElement>(null);
  useEffect(() => {
    if (ref.current) ref.current.indeterminate = mixed;
  }, [mixed]);
  return ref;
}

/** A question with several answers: radio buttons or checkboxes under one legend. */
export function FieldSet({
  legend,
  help,
  error,
  children,
}: {
  legend: ReactNode;
  help?: ReactNode;
  error?: ReactNode;
  children: ReactNode;
}) {
  return (
    <fieldset className="grid gap-1">
      <legend className="mb-1 font-semibold">{legend}</legend>
      {error ? (
        <p className="text-13 text-rust">
          <span aria-hidden="true">▲ </span>
          {error}
        </p>
      ) : null}
      {children}
      {help ? <p className="max-w-line text-13 text-ink-soft">{help}</p> : null}
    </fieldset>
  );
}
