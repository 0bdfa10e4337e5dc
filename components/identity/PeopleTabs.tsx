import { Tabs } from '@/components/ui/Tabs';

/** The two pages about people, side by side. */
export function PeopleTabs({ current, open }: { current: 'people' | 'invitations'; open: number }) {
  return (
    <Tabs
      label="People and invitations"
      tabs={[
        { href: '/keyroom/people', label: 'People', current: current === 'people' },
        {
          href: '/keyroom/people/invitations',
          label: 'Invitations',
          count: open,
          current: current === 'invitations',
        },
      ]}
    />
  );
}
