import type { ReactNode } from 'react';
import { Tabs } from '@/components/ui/Tabs';
import { readVisitor } from '@/lib/http/page';
import { may, type Permission } from '@/lib/identity/permissions';

/** The pages of the Key room, each with what it asks for. */
const PAGES = [
  { href: '/keyroom', label: 'Credentials', permission: 'credential.read' },
  { href: '/keyroom/rotations', label: 'Rotation runs', permission: 'credential.read' },
  { href: '/keyroom/keys', label: 'Signing keys', permission: 'credential.read' },
  { href: '/keyroom/people', label: 'People', permission: 'people.read' },
  { href: '/keyroom/policies', label: 'Policies', permission: 'policy.read' },
  { href: '/keyroom/connections', label: 'Connections', permission: 'connections.read' },
  { href: '/keyroom/clients', label: 'API clients', permission: 'connections.read' },
  { href: '/keyroom/webhooks', label: 'Webhooks', permission: 'connections.read' },
  { href: '/keyroom/health', label: 'Health', permission: 'health.read' },
] as const satisfies { href: string; label: string; permission: Permission }[];

/** Above every page of the Key room: the way to the others. */
export default async function KeyRoomLayout({ children }: { children: ReactNode }) {
  const { person } = await readVisitor();
  const tabs = PAGES.filter(({ permission }) => person && may(person.roles, permission));
  return (
    <>
      {tabs.length > 1 ? (
        <Tabs label="Key room" tabs={tabs.map(({ href, label }) => ({ href, label }))} />
      ) : null}
      {children}
    </>
  );
}
