'use client';

import { useRouter } from 'next/navigation';
import { useState } from 'react';
import { sendJson } from '@/components/shell/useData';
import { Button } from '@/components/ui/Button';
import { ConfirmDialog } from '@/components/ui/ConfirmDialog';
import { tell } from '@/components/ui/Toast';

const ACTS: Record<string, { label: string; consequence: string; danger: boolean }> = {
  'in-service': {
    label: 'Put back in service',
    consequence: 'Its clips are taken again from now on.',
    danger: false,
  },
  quarantined: {
    label: 'Quarantine',
    consequence: 'Its clips stay valid on the device but are not taken. An open listening session ends.',
    danger: true,
  },
  'in-repair': {
    label: 'Send to repair',
    consequence: 'Its clips stay valid on the device but are not taken. An open listening session ends.',
    danger: false,
  },
  retired: {
    label: 'Retire',
    consequence: 'Its credentials end for good. What it recorded stays. This cannot be taken back.',
    danger: true,
  },
};

/** Service life: the states that may follow the present one, each with a reason. */
export function StateChange({
  deviceId,
  assetTag,
  version,
  next,
}: {
  deviceId: string;
  assetTag: string;
  version: number;
  next: readonly string[];
}) {
  const router = useRouter();
  const [to, setTo] = useState<string | null>(null);
  const act = to === null ? null : ACTS[to];
  return (
    <div className="flex flex-wrap gap-2">
      {next
        .filter((state) => ACTS[state])
        .map((state) => (
          <Button
            key={state}
            size="small"
            variant={ACTS[state]?.danger ? 'danger' : 'plain'}
            onClick={() => setTo(state)}
          >
            {ACTS[state]?.label}…
          </Button>
        ))}
      <ConfirmDialog
        open={act !== null}
        onOpenChange={(open) => {
          if (!open) setTo(null);
        }}
        title={`${act?.label ?? ''}: ${assetTag}`}
        confirmLabel={act?.label ?? ''}
        danger={act?.danger ?? false}
        reason={{ label: 'Reason', help: 'It stands in the custody thread with your name.' }}
        {...(to === 'retired' ? { typed: { text: assetTag } } : {})}
        onConfirm={async ({ reason }) => {
          await sendJson(`/api/devices/${deviceId}/state`, { to, reason, version }, crypto.randomUUID());
          tell(`${assetTag}: ${act?.label.toLowerCase() ?? ''}`);
          router.refresh();
        }}
      >
        {act?.consequence}
      </ConfirmDialog>
    </div>
  );
}
