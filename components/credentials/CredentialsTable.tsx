'use client';

import Link from 'next/link';
import { useState } from 'react';
import { concerns } from '@/components/shell/LiveEvents';
import { sendJson, useData } from '@/components/shell/useData';
import { Button } from '@/components/ui/Button';
import { useClock } from '@/components/ui/Clock';
import { ConfirmDialog } from '@/components/ui/ConfirmDialog';
import { DataTable } from '@/components/ui/DataTable';
import { EmptyState } from '@/components/ui/EmptyState';
import { Time } from '@/components/ui/Time';
import { tell } from '@/components/ui/Toast';
import { type ColumnOf, tableOf } from '@/components/ui/tableRows';

export interface CredentialRow {
  id: string;
  label: string;
  deviceId: string;
  assetTag: string;
  model: string;
  ward: string | null;
  boundThumbprint: string | null;
  state: 'issued' | 'in-use' | 'superseded' | 'retired' | 'revoked';
  firstUsedAt: number | null;
  lastUsedAt: number | null;
  expiresAt: number;
  overlapEndsAt: number | null;
  renewalAskedAt: number | null;
  endReason: string | null;
  lastHeardAt: number | null;
  version: number;
}
export interface CredentialAnswer {
  rows: CredentialRow[];
  next: string | null;
}

const DAY_MS = 86_400_000;
type Asked = { row: CredentialRow; act: 'rotate' | 'revoke' };

function State({ row }: { row: CredentialRow }) {
  const { now } = useClock();
  if (row.state === 'revoked' || row.state === 'retired')
    return (
      <>
        {row.state === 'revoked' ? 'Revoked' : 'Retired'}
        {row.endReason ? `, ${row.endReason}` : ''}
      </>
    );
  if (now !== undefined && row.expiresAt <= now) return <>Ended</>;
  if (row.state === 'superseded')
    return (
      <>
        Superseded, works until <Time at={row.overlapEndsAt} mode="minute" />
      </>
    );
  if (row.renewalAskedAt !== null)
    return (
      <>
        Asked to renew <Time at={row.renewalAskedAt} ago />
      </>
    );
  return <>{row.state === 'in-use' ? 'In use' : 'Issued, not used yet'}</>;
}

function Ends({ row }: { row: CredentialRow }) {
  const { now } = useClock();
  const living = ['issued', 'in-use', 'superseded'].includes(row.state);
  const left = now === undefined ? Number.POSITIVE_INFINITY : row.expiresAt - now;
  return (
    <Time
      at={row.expiresAt}
      mode="date"
      {...(living && left < 7 * DAY_MS
        ? { className: 'font-semibold text-rust' }
        : living && left < 14 * DAY_MS
          ? { className: 'font-semibold text-brass' }
          : {})}
    />
  );
}

/** Credentials, soonest end first, each to be rotated or revoked. */
export function CredentialsTable({
  href,
  first,
  olderHref,
  newerHref,
  filtered,
}: {
  href: string;
  first: CredentialAnswer;
  olderHref: string | null;
  newerHref: string | null;
  filtered: boolean;
}) {
  const { data, error, mutate } = useData<CredentialAnswer>(href, first, (event) =>
    concerns(event, 'credential'),
  );
  const [asked, setAsked] = useState<Asked | null>(null);
  const columns: ColumnOf<CredentialRow>[] = [
    {
      id: 'device',
      header: 'Device',
      fixed: true,
      cell: (c) => (
        <Link className="link mono" href={`/devices/${c.deviceId}`}>
          {c.assetTag}
        </Link>
      ),
    },
    { id: 'label', header: 'Credential', cell: (c) => <span className="mono">{c.label}</span> },
    {
      id: 'bound',
      header: 'Bound to key',
      cell: (c) =>
        c.boundThumbprint ? (
          <span className="mono" title={c.boundThumbprint}>
            {c.boundThumbprint.slice(0, 4)}…{c.boundThumbprint.slice(-2)}
          </span>
        ) : (
          <span className="font-semibold text-brass">◐ bearer only</span>
        ),
    },
    { id: 'state', header: 'State', maxWidth: '34ch', cell: (c) => <State row={c} /> },
    { id: 'ward', header: 'Ward', maxWidth: '18ch', cell: (c) => c.ward ?? 'none' },
    { id: 'used', header: 'Last used', cell: (c) => <Time at={c.lastUsedAt} never="not yet" /> },
    { id: 'heard', header: 'Device heard', hidden: true, cell: (c) => <Time at={c.lastHeardAt} /> },
    { id: 'ends', header: 'Ends', cell: (c) => <Ends row={c} /> },
    {
      id: 'acts',
      header: 'Act',
      cell: (c) =>
        ['issued', 'in-use'].includes(c.state) ? (
          <span className="flex gap-2">
            <Button
              size="small"
              disabled={c.renewalAskedAt !== null}
              onClick={() => setAsked({ row: c, act: 'rotate' })}
              aria-label={`Rotate the credential of ${c.assetTag}`}
            >
              Rotate…
            </Button>
            <Button
              size="small"
              variant="danger"
              onClick={() => setAsked({ row: c, act: 'revoke' })}
              aria-label={`Revoke the credential of ${c.assetTag}`}
            >
              Revoke…
            </Button>
          </span>
        ) : null,
    },
  ];
  const table = tableOf(data?.rows ?? [], columns, {
    id: (c) => c.id,
    label: (c) => `${c.label} of ${c.assetTag}`,
    href: (c) => `/devices/${c.deviceId}`,
  });
  return (
    <>
      <DataTable
        caption="Credentials"
        tableId="credentials"
        {...table}
        olderHref={olderHref}
        newerHref={newerHref}
        error={error && !data ? { message: error.message, onRetry: () => void mutate() } : null}
        empty={
          <EmptyState title={filtered ? 'No credential matches' : 'No credentials yet'}>
            {filtered
              ? 'Take a filter away.'
              : 'A device gets its first credential when it enrols at the bench.'}
          </EmptyState>
        }
      />
      <ConfirmDialog
        open={asked !== null}
        onOpenChange={(open) => {
          if (!open) setAsked(null);
        }}
        title={
          asked
            ? `${asked.act === 'rotate' ? 'Rotate' : 'Revoke'} the credential of ${asked.row.assetTag}`
            : ''
        }
        confirmLabel={asked?.act === 'revoke' ? 'Revoke the credential' : 'Rotate the credential'}
        danger={asked?.act === 'revoke'}
        {...(asked?.act === 'revoke'
          ? { reason: { label: 'Reason' }, typed: { text: asked.row.assetTag } }
          : {})}
        onConfirm={async ({ reason }) => {
          if (!asked) return;
          const { row, act } = asked;
          await sendJson(
            `/api/credentials/${row.id}/${act}`,
            act === 'rotate' ? { version: row.version } : { version: row.version, reason },
            crypto.randomUUID(),
          );
          tell(
            act === 'rotate'
              ? `${row.assetTag} is told to renew with its next call`
              : `The credential of ${row.assetTag} is revoked`,
          );
          await mutate();
        }}
      >
        {asked?.act === 'revoke'
          ? 'It stops working at once, and so does every other of its family. The device must be enrolled again at the bench; clips on it stay valid.'
          : 'The device is told to renew with its next call. The old credential keeps working until the new one is first used, at most 24 hours.'}
      </ConfirmDialog>
    </>
  );
}
