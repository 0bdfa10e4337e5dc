import { headers } from 'next/headers';
import { notFound, redirect } from 'next/navigation';
import { cache } from 'react';
import { may, type Permission } from '@/lib/identity/permissions';
import { readPerson, type SignedIn } from '@/lib/identity/readPerson';
import type { Authorized } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { getServices } from './services';

/** Who looks at a page, or null. Read once for a page and the layout around it. */
export const readVisitor = cache(async (): Promise<{ person: SignedIn | null; services: Services }> => {
  const services = await getServices();
  return { person: await readPerson(services, await headers()), services };
});

/**
 * Authority for a page. Signed out: to the sign-in page and back here. Not permitted: the same "not found" as for what
 * does not exist. Role that needs a second factor without one: to the page where it is set up.
 */
export async function requirePage<P extends Permission>(
  permission: P,
  options: { beforeSecondFactor?: boolean } = {},
): Promise<{ person: Authorized<P>; services: Services }> {
  const { person, services } = await readVisitor();
  if (!person)
    redirect(`/sign-in?next=${encodeURIComponent((await headers()).get('x-bellkeep-path') ?? '/')}`);
  if (person.needsSecondFactor && !options.beforeSecondFactor) redirect('/account?second-factor=required');
  if (!may(person.roles, permission)) notFound();
  return { person: person as unknown as Authorized<P>, services };
}

/** A further permission of whoever looks at a page; null where they lack it. */
export function granted<P extends Permission>(
  person: Authorized<Permission>,
  permission: P,
): Authorized<P> | null {
  return may(person.roles, permission) ? (person as unknown as Authorized<P>) : null;
}

/** What a page shows, or the page for what one may not see and for what does not exist, which look alike. */
export async function orNotFound<T>(wanted: Promise<T>): Promise<T> {
  try {
    return await wanted;
  } catch (error) {
    if (error instanceof Refusal && error.code === 'not-found') notFound();
    throw error;
  }
}
