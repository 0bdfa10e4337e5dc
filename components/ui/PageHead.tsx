import type { ReactNode } from 'react';

export interface PageHeadProps {
  title: ReactNode;
  /** The one primary action (a ButtonLink or a Button), or a few where there must be. */
  action?: ReactNode;
  /** Above the title: where one came from. */
  back?: ReactNode;
  /** One sentence that says the state of things; its numbers are links. */
  children?: ReactNode;
}

export function PageHead({ title, action, back, children }: PageHeadProps) {
  return (
    <header className="mb-6 grid items-end gap-x-6 gap-y-3 plate:grid-cols-[1fr_auto]">
      <div className="min-w-0">
        {back ? <p className="mb-1 text-13">{back}</p> : null}
        <h1 className="break-words">{title}</h1>
        {children ? <p className="mt-1.5 max-w-line text-17 text-ink-soft">{children}</p> : null}
      </div>
      {action ? <div className="no-print flex flex-wrap gap-3">{action}</div> : null}
    </header>
  );
}
