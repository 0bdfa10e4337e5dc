'use client';

import { useRouter } from 'next/navigation';
import { useState } from 'react';
import { sendJson } from '@/components/shell/useData';
import { Button } from '@/components/ui/Button';
import { ConfirmDialog } from '@/components/ui/ConfirmDialog';
import { tell } from '@/components/ui/Toast';
import { useTableSelection } from '@/components/ui/useTableSelection';

/** What can be done with the devices that are selected. */
export function FleetActions({
  lines,
  onDone,
}: {
  lines: readonly { id: string; assetTag: string; state: string; version: number }[];
  onDone: () => void;
}) {
  const { ids, clear } = useTableSelection();
  const router = useRouter();
  const [asking, setAsking] = useState(false);
  const chosen = lines.filter((line) => ids.includes(line.id));
  const open = chosen.filter((line) => line.state === 'in-service' || line.state === 'in-repair');
  return (
    <>
      <Button variant="bar" onClick={() => setAsking(true)} disabled={open.length === 0}>
        Quarantine…
      </Button>
      <Button
        variant="bar"
        onClick={() => router.push(`/devices/${ids[0]}/sheet?also=${ids.slice(1).join(',')}`)}
        disabled={ids.length > 50}
      >
        Print sheets
      </Button>
      <ConfirmDialog
        open={asking}
        onOpenChange={setAsking}
        title={`Quarantine ${open.length === 1 ? open[0]?.assetTag : `${open.length} devices`}`}
        confirmLabel={`Quarantine ${open.length} ${open.length === 1 ? 'device' : 'devices'}`}
        reason={{ label: 'Reason' }}
        onConfirm={async ({ reason }) => {
          for (const line of open)
            await sendJson(
              `/api/devices/${line.id}/state`,
              { to: 'quarantined', reason, version: line.version },
              crypto.randomUUID(),
            );
          tell(`${open.length} ${open.length === 1 ? 'device is' : 'devices are'} quarantined`);
          clear();
          onDone();
        }}
      >
        Their clips stay valid on the devices but are not taken until they are back in service. Open listening
        sessions end.
      </ConfirmDialog>
    </>
  );
}
