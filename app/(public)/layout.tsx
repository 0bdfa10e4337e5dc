import { connection } from 'next/server';
import type { ReactNode } from 'react';
import { Clock } from '@/components/ui/Clock';
import { getServices } from '@/lib/http/services';

/** Pages outside the rooms: sign-in, invitation, reset, problem types. */
export default async function PublicLayout({ children }: { children: ReactNode }) {
  await connection();
  const { env, clock } = await getServices();
  return (
    <main id="main" className="mx-auto grid min-h-dvh w-full max-w-[560px] content-center gap-2 px-4 py-12">
      <p className="mb-4 font-plate text-21 leading-none font-semibold text-ink-soft">Bellkeep</p>
      <Clock now={clock.now()} zone={env.BELLKEEP_TIME_ZONE}>
        <div>{children}</div>
      </Clock>
      <p className="mt-10 border-t border-line pt-3 text-13 text-ink-soft">{env.BELLKEEP_HOSPITAL}</p>
    </main>
  );
}
