'use client';

import Link from 'next/link';
import { useState } from 'react';
import { concerns } from '@/components/shell/LiveEvents';
import { sendJson, useData } from '@/components/shell/useData';
import { Button } from '@/components/ui/Button';
import { ConfirmDialog } from '@/components/ui/ConfirmDialog';
import { DataTable } from '@/components/ui/DataTable';
import { DefinitionList } from '@/components/ui/DefinitionList';
import { EmptyState } from '@/components/ui/EmptyState';
import { Panel } from '@/components/ui/Panel';
import { Time } from '@/components/ui/Time';
import { tell } from '@/components/ui/Toast';
import { type ColumnOf, tableOf } from '@/components/ui/tableRows';
import { type MemberRow, RUN_WORDS, type RunRow, totalOf } from './runWords';

export interface RunAnswer {
  run: RunRow;
  rows: MemberRow[];
  next: string | null;
}

const stateWords = (member: MemberRow): string => {
  if (member.state === 'waiting') return 'not told yet';
  if (member.state === 'asked') return member.renewed ? 'renewed, not used yet' : 'told, not renewed yet';
  if (member.state === 'done') return 'renewed and in use';
  return member.state === 'missed' ? 'missed the deadline' : 'ended otherwise';
};

const COLUMNS: ColumnOf<MemberRow>[] = [
  {
    id: 'device',
    header: 'Device',
    fixed: true,
    cell: (m) => (
      <Link className="link mono" href={`/devices/${m.deviceId}`}>
        {m.assetTag}
      </Link>
    ),
  },
  { id: 'ward', header: 'Ward', maxWidth: '20ch', cell: (m) => m.ward ?? 'none' },
  { id: 'state', header: 'State', cell: stateWords },
  { id: 'heard', header: 'Device heard', cell: (m) => <Time at={m.lastHeardAt} ago never="never" /> },
  { id: 'asked', header: 'Told', cell: (m) => <Time at={m.askedAt} mode="minute" never="not yet" /> },
  { id: 'label', header: 'Credential', cell: (m) => <span className="mono">{m.label}</span> },
];

/** How far a run is, live, with those who are not done by name and ward. */
export function RunView({
  href,
  first,
  olderHref,
  newerHref,
}: {
  href: string;
  first: RunAnswer;
  olderHref: string | null;
  newerHref: string | null;
}) {
  const { data, error, mutate } = useData<RunAnswer>(
    href,
    first,
    (event) => concerns(event, 'rotation') || concerns(event, 'credential'),
  );
  const { run, rows } = data ?? first;
  const table = tableOf(rows, COLUMNS, {
    id: (m) => m.credentialId,
    label: (m) => m.assetTag,
    href: (m) => `/devices/${m.deviceId}`,
  });
  return (
    <>
      <Progress run={run} onChange={() => void mutate()} />
      <DataTable
        caption="Devices of this run"
        tableId="rotation-members"
        {...table}
        olderHref={olderHref}
        newerHref={newerHref}
        error={error && !data ? { message: error.message, onRetry: () => void mutate() } : null}
        empty={<EmptyState title="None">No device of this run is in this state.</EmptyState>}
      />
    </>
  );
}

function Progress({ run, onChange }: { run: RunRow; onChange: () => void }) {
  const total = totalOf(run);
  const { done, asked, waiting, missed } = run.counts;
  return (
    <Panel title={RUN_WORDS[run.state]} aside={<Steer run={run} onChange={onChange} />} className="mb-6">
      <progress
        className="mb-3 h-3 w-full accent-current"
        max={total}
        value={done}
        aria-label={`${done} of ${total} renewed and in use`}
      />
      <p className="mb-4" aria-live="polite">
        <strong>
          {done} of {total}
        </strong>{' '}
        renewed and in use; {asked} told, {waiting} not told yet
        {missed > 0 ? `, ${missed} missed the deadline` : ''}.
      </p>
      <DefinitionList
        facts={[
          { term: 'Deadline', value: <Time at={run.deadlineAt} mode="minute" /> },
          {
            term: 'Who misses it',
            value: run.atDeadline === 'keep' ? 'keeps the old credential' : 'is revoked',
          },
          {
            term: 'Waves',
            value: `${run.waveSize} devices, ${Math.round(run.wavePauseMs / 60_000)} minutes between`,
          },
          { term: 'Started by', value: run.startedBy },
          { term: 'Reason', value: run.reason },
        ]}
      />
    </Panel>
  );
}

function Steer({ run, onChange }: { run: RunRow; onChange: () => void }) {
  const [cancelling, setCancelling] = useState(false);
  const [busy, setBusy] = useState(false);
  const steer = async (to: 'pause' | 'resume' | 'cancel') => {
    await sendJson(`/api/rotations/${run.id}/steer`, { to, version: run.version }, crypto.randomUUID());
    onChange();
  };
  const quickly = async (to: 'pause' | 'resume') => {
    setBusy(true);
    await steer(to).catch((error: unknown) => tell(error instanceof Error ? error.message : 'No answer'));
    setBusy(false);
  };
  if (run.state !== 'running' && run.state !== 'paused') return null;
  return (
    <span className="flex gap-2">
      <Button size="small" busy={busy} onClick={() => quickly(run.state === 'running' ? 'pause' : 'resume')}>
        {run.state === 'running' ? 'Pause' : 'Resume'}
      </Button>
      <Button size="small" variant="danger" onClick={() => setCancelling(true)}>
        Cancel the run…
      </Button>
      <ConfirmDialog
        open={cancelling}
        onOpenChange={setCancelling}
        title={`Cancel ${run.label}`}
        confirmLabel="Cancel the run"
        onConfirm={() => steer('cancel')}
      >
        Devices that were told already renew all the same. Nobody else is told, and no deadline acts.
      </ConfirmDialog>
    </span>
  );
}
