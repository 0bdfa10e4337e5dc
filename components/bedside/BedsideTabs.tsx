import { Tabs } from '@/components/ui/Tabs';

/** The places of Bedside, side by side. */
export function BedsideTabs({
  current,
  tray,
}: {
  current: 'encounters' | 'tray' | 'recordings';
  tray: number;
}) {
  return (
    <Tabs
      label="Bedside"
      tabs={[
        { href: '/bedside', label: 'Encounters', current: current === 'encounters' },
        { href: '/bedside/tray', label: 'Tray', count: tray, current: current === 'tray' },
        { href: '/bedside/recordings', label: 'Recordings', current: current === 'recordings' },
      ]}
    />
  );
}
