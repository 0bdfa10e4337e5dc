'use client';

import {
  createContext,
  type InputHTMLAttributes,
  type ReactNode,
  type SelectHTMLAttributes,
  type TextareaHTMLAttributes,
  useContext,
  useId,
} from 'react';
import { cx } from './cx';

interface Wiring {
  id: string;
  describedBy?: string;
  invalid: boolean;
  required: boolean;
}
const FieldContext = createContext<Wiring | null>(null);

export interface FieldProps {
  label: ReactNode;
  /** Stands under the control and is read with it. */
  help?: ReactNode;
  /** Stands beside the control and marks it invalid. */
  error?: ReactNode;
  /** Give one where an error summary must link here; else one is made. */
  id?: string;
  /** Sets the control's own `required`. */
  required?: boolean;
  /** Says so after the label. */
  optional?: boolean;
  className?: string;
  children: ReactNode;
}

/** Label above, control, error beside, help under. The control inside takes its ids from here. */
export function Field({
  label,
  help,
  error,
  id,
  required = false,
  optional = false,
  className,
  children,
}: FieldProps) {
  const made = useId();
  const controlId = id ?? made;
  const helpId = help ? `${controlId}-help` : undefined;
  const errorId = error ? `${controlId}-error` : undefined;
  const describedBy = [errorId, helpId].filter(Boolean).join(' ') || undefined;
  return (
    <FieldContext value={{ id: controlId, describedBy, invalid: Boolean(error), required }}>
      <div className={cx('grid gap-1', className)}>
        <label htmlFor={controlId} className="font-semibold">
          {label}
          {optional ? <span className="font-normal text-13 text-ink-soft"> (optional)</span> : null}
        </label>
        <div className="flex flex-wrap items-start gap-x-3 gap-y-1">
          <div className="min-w-0 flex-[1_1_240px]">{children}</div>
          {error ? (
            <p id={errorId} className="max-w-[36ch] flex-[0_1_auto] self-center text-13 text-rust">
              <span aria-hidden="true">▲ </span>
              {error}
            </p>
          ) : null}
        </div>
        {help ? (
          <p id={helpId} className="max-w-line text-13 text-ink-soft">
            {help}
          </p>
        ) : null}
      </div>
    </FieldContext>
  );
}

/** Ids and states for a control of one's own inside a Field. */
export function useField() {
  const wiring = useContext(FieldContext);
  return wiring
    ? {
        id: wiring.id,
        'aria-describedby': wiring.describedBy,
        'aria-invalid': wiring.invalid || undefined,
        required: wiring.required || undefined,
      }
    : {};
}

const CONTROL =
  'w-full rounded-plate border border-line-control bg-sheet px-[11px] py-[9px] text-ink aria-invalid:border-rust aria-invalid:border-2 disabled:opacity-55 [input&]:read-only:bg-well';

export function TextInput({
  className,
  mono,
  ...rest
}: InputHTMLAttributes<HTMLInputElement> & { mono?: boolean }) {
  return (
    <input type="text" {...useField()} {...rest} className={cx(CONTROL, mono && 'font-mono', className)} />
  );
}

export function Textarea({ className, ...rest }: TextareaHTMLAttributes<HTMLTextAreaElement>) {
  return <textarea rows={3} {...useField()} {...rest} className={cx(CONTROL, 'block', className)} />;
}

export interface SelectProps extends SelectHTMLAttributes<HTMLSelectElement> {
  options: readonly { value: string; label: string; disabled?: boolean }[];
  /** First, empty choice, in words ("Choose a ward"). */
  placeholder?: string;
}

export function Select({ options, placeholder, className, ...rest }: SelectProps) {
  return (
    <select {...useField()} {...rest} className={cx(CONTROL, 'min-h-[42px]', className)}>
      {placeholder === undefined ? null : <option value="">{placeholder}</option>}
      {options.map((option) => (
        <option key={option.value} value={option.value} disabled={option.disabled}>
          {option.label}
        </option>
      ))}
    </select>
  );
}
