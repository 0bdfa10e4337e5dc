import { redirect } from 'next/navigation';
import { readVisitor } from '@/lib/http/page';
import { may, ROOMS } from '@/lib/identity/permissions';

export const dynamic = 'force-dynamic';

/** The way in: to one's first room, or to the sign-in page. */
export default async function Home() {
  const { person } = await readVisitor();
  if (!person) redirect('/sign-in');
  redirect(ROOMS.find((room) => may(person.roles, room.permission))?.href ?? '/account');
}
