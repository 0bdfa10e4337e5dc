import type { ReactNode } from 'react';

export interface PatientBarProps {
  name: string;
  /** The first identifier, in words: "14 Mar 1951". */
  born: string;
  /** The second. */
  recordNumber: string;
  /** One button, such as "End session" (variant `bar`). */
  action?: ReactNode;
  /** More that tells patients apart: sex, bed. */
  children?: ReactNode;
}

/** Who is being listened to: both identifiers, always in sight. A page that holds it has no plate. */
export function PatientBar({ name, born, recordNumber, action, children }: PatientBarProps) {
  return (
    <section
      data-plain-page=""
      aria-label="Patient"
      className="on-bar sticky top-0 z-4 grid grid-cols-[minmax(0,1fr)_auto] items-center gap-x-4 gap-y-1 bg-bar px-4 py-3 text-on-bar plate:px-8 min-[641px]:px-8 min-[641px]:py-3.5"
    >
      <div className="min-w-0">
        <h1 className="text-21 leading-tight break-words">{name}</h1>
        <p className="flex flex-wrap gap-x-[18px] text-15 min-[641px]:text-17">
          <span>Born {born}</span>
          <span className="whitespace-nowrap">
            Record <span className="mono">{recordNumber}</span>
          </span>
          {children}
        </p>
      </div>
      {action}
    </section>
  );
}

/** The body of a page without a plate: padded, and clear of the bar at the bottom. */
export function PlainPage({ children }: { children: ReactNode }) {
  return (
    <div
      data-plain-page=""
      className="mx-auto grid max-w-[960px] gap-5 px-4 pt-4 pb-24 min-[641px]:px-8 min-[641px]:pt-5"
    >
      {children}
    </div>
  );
}
