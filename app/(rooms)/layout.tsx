import { cookies, headers } from 'next/headers';
import { redirect } from 'next/navigation';
import type { ReactNode } from 'react';
import { Shell } from '@/components/shell/Shell';
import { THEME_COOKIE, themeOf } from '@/components/shell/theme';
import { readVisitor } from '@/lib/http/page';
import { authOf } from '@/lib/identity/auth';

/** End this session: a form that works without scripts too. */
async function signOut(): Promise<void> {
  'use server';
  const { services } = await readVisitor();
  const { headers: answered } = await authOf(services).api.signOut({
    headers: await headers(),
    returnHeaders: true,
  });
  const jar = await cookies();
  for (const line of answered.getSetCookie()) {
    const name = line.slice(0, line.indexOf('='));
    jar.delete(name);
  }
  redirect('/sign-in');
}

/** The signed-in shell around every room. */
export default async function RoomsLayout({ children }: { children: ReactNode }) {
  const { person, services } = await readVisitor();
  if (!person)
    redirect(`/sign-in?next=${encodeURIComponent((await headers()).get('x-bellkeep-path') ?? '/')}`);
  const { env } = services;
  return (
    <Shell
      person={{ name: person.name, jobTitle: person.jobTitle, roles: person.roles }}
      hospital={env.BELLKEEP_HOSPITAL}
      theme={themeOf((await cookies()).get(THEME_COOKIE)?.value)}
      now={services.clock.now()}
      zone={env.BELLKEEP_TIME_ZONE}
      signOut={signOut}
    >
      {children}
    </Shell>
  );
}
