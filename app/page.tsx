import { redirect } from 'next/navigation';
import { readVisitor } from '@/lib/http/page';
import { ROLES, type Role } from '@/lib/identity/permissions';

export const dynamic = 'force-dynamic';

/** The room where each role does its work. */
const OWN_ROOM: Record<Role, string> = {
  biomed: '/bench',
  clinician: '/bedside',
  itadmin: '/keyroom',
  auditor: '/ledger',
};

/** The way in: to one's own room, or to the sign-in page. */
export default async function Home() {
  const { person } = await readVisitor();
  if (!person) redirect('/sign-in');
  const role = ROLES.find((held) => person.roles.includes(held));
  redirect(role ? OWN_ROOM[role] : '/account');
}
