import { connection } from 'next/server';
import type { ReactNode } from 'react';
import { Clock } from '@/components/ui/Clock';
import { getServices } from '@/lib/http/services';

/** Pages outside the rooms: sign-in, invitation, reset, problem types, and what device makers read. */
export default async function PublicLayout({ children }: { children: ReactNode }) {
  await connection();
  const { env, clock } = await getServices();
  return (
    <main
      id="main"
      className="mx-auto grid min-h-dvh w-full max-w-[560px] grid-cols-[minmax(0,1fr)] content-center gap-2 px-4 py-12 has-[[data-wide-page]]:max-w-[960px] has-[[data-wide-page]]:content-start"
    >
      <p className="mb-4 font-plate text-21 leading-none font-semibold text-ink-soft">Bellkeep</p>
      <Clock now={clock.now()} zone={env.BELLKEEP_TIME_ZONE}>
        <div>{children}</div>
      </Clock>
      <p className="mt-10 border-t border-line pt-3 text-13 text-ink-soft">{env.BELLKEEP_HOSPITAL}</p>
    </main>
  );
}
