import type { ReactNode } from 'react';

/** A page that stands alone, outside every room: not found, failed, sign-in. */
export function LonePage({ title, children }: { title: string; children: ReactNode }) {
  return (
    <main className="mx-auto grid min-h-dvh max-w-[560px] content-center gap-4 px-4 py-12">
      <p className="font-plate text-21 font-semibold text-ink-soft">Bellkeep</p>
      <h1>{title}</h1>
      <div className="grid gap-4 text-17">{children}</div>
    </main>
  );
}
