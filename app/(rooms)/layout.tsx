import { cookies, headers } from 'next/headers';
import { redirect } from 'next/navigation';
import type { ReactNode } from 'react';
import { Shell } from '@/components/shell/Shell';
import { THEME_COOKIE, themeOf } from '@/components/shell/theme';
import { readVisitor } from '@/lib/http/page';

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
      signOut="/api/account/sign-out"
    >
      {children}
    </Shell>
  );
}
