import type { ReactNode } from 'react';

export interface EmptyStateProps {
  /** What would be here: "No devices yet". */
  title: string;
  /** How to get the first one. */
  children?: ReactNode;
  action?: ReactNode;
}

export function EmptyState({ title, children, action }: EmptyStateProps) {
  return (
    <div className="grid justify-items-start gap-2 px-6 py-10">
      <p className="text-17 font-semibold">{title}</p>
      {children ? <div className="max-w-line text-ink-soft">{children}</div> : null}
      {action ? <div className="mt-2">{action}</div> : null}
    </div>
  );
}
