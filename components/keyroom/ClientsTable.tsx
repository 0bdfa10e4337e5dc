'use client';

import { useRouter } from 'next/navigation';
import { useState } from 'react';
import { concerns } from '@/components/shell/LiveEvents';
import { sendJson, useData } from '@/components/shell/useData';
import { Button } from '@/components/ui/Button';
import { ConfirmDialog } from '@/components/ui/ConfirmDialog';
import { CopyText } from '@/components/ui/CopyText';
import { DataTable } from '@/components/ui/DataTable';
import { EmptyState } from '@/components/ui/EmptyState';
import { Time } from '@/components/ui/Time';
import { tell } from '@/components/ui/Toast';
import { type ColumnOf, tableOf } from '@/components/ui/tableRows';
import { ShownOnce } from './ShownOnce';

export interface ClientRow {
  id: string;
  name: string;
  scopes: string[];
  method: string;
  createdAt: number;
  createdBy: string;
  lastUsedAt: number | null;
  previousEndsAt: number | null;
  revokedAt: number | null;
  version: number;
}
export interface ClientsAnswer {
  rows: ClientRow[];
  next: string | null;
}
type Act = 'rotate' | 'rotate-now' | 'revoke';

const columnsOf = (onAct: (row: ClientRow, act: Act) => void): ColumnOf<ClientRow>[] => [
  { id: 'name', header: 'Client', fixed: true, maxWidth: '28ch', cell: (c) => c.name },
  {
    id: 'id',
    header: 'Client id',
    cell: (c) => <CopyText text={c.id} what="client id" shown={`${c.id.slice(0, 8)}…`} />,
  },
  { id: 'scopes', header: 'May read', wrap: true, maxWidth: '26ch', cell: (c) => c.scopes.join(', ') },
  {
    id: 'method',
    header: 'Signs in with',
    cell: (c) =>
      c.method === 'private_key_jwt' ? (
        'its own keys'
      ) : c.previousEndsAt ? (
        <>
          secret; the one before until <Time at={c.previousEndsAt} mode="minute" />
        </>
      ) : (
        'secret'
      ),
  },
  { id: 'used', header: 'Last used', cell: (c) => <Time at={c.lastUsedAt} never="not yet" /> },
  { id: 'made', header: 'Made', hidden: true, cell: (c) => <Time at={c.createdAt} mode="date" /> },
  { id: 'by', header: 'By', hidden: true, maxWidth: '20ch', cell: (c) => c.createdBy },
  {
    id: 'acts',
    header: 'Act',
    cell: (c) =>
      c.revokedAt === null ? (
        <span className="flex gap-2">
          {c.method === 'private_key_jwt' ? null : (
            <Button
              size="small"
              aria-label={`Rotate the secret of ${c.name}`}
              onClick={() => onAct(c, 'rotate')}
            >
              Rotate…
            </Button>
          )}
          <Button
            size="small"
            variant="danger"
            aria-label={`Revoke ${c.name}`}
            onClick={() => onAct(c, 'revoke')}
          >
            Revoke…
          </Button>
        </span>
      ) : (
        <>
          revoked <Time at={c.revokedAt} ago />
        </>
      ),
  },
];

/** Other systems that read, each to be rotated or revoked. */
export function ClientsTable({
  href,
  first,
  olderHref,
  newerHref,
  filtered,
}: {
  href: string;
  first: ClientsAnswer;
  olderHref: string | null;
  newerHref: string | null;
  filtered: boolean;
}) {
  const router = useRouter();
  const { data, error, mutate } = useData<ClientsAnswer>(href, first, (event) => concerns(event, 'client'));
  const [asked, setAsked] = useState<{ row: ClientRow; act: Act } | null>(null);
  const [secret, setSecret] = useState<{ text: string | null } | null>(null);
  const done = () => {
    void mutate();
    router.refresh();
  };
  const table = tableOf(
    data?.rows ?? [],
    columnsOf((row, act) => setAsked({ row, act })),
    {
      id: (c) => c.id,
      label: (c) => c.name,
    },
  );
  async function confirm(reason: string) {
    if (!asked) return;
    const { row, act } = asked;
    const path = `/api/clients/${row.id}/${act === 'revoke' ? 'revoke' : 'rotate'}`;
    const body =
      act === 'revoke'
        ? { version: row.version, reason }
        : { version: row.version, atOnce: act === 'rotate-now' };
    const answer = await sendJson<{ secret?: string | null }>(path, body, crypto.randomUUID());
    if (act === 'revoke') tell(`${row.name} reads no more`);
    else setSecret({ text: answer.secret ?? null });
    done();
  }
  return (
    <>
      <DataTable
        caption="API clients"
        tableId="clients"
        {...table}
        olderHref={olderHref}
        newerHref={newerHref}
        error={error && !data ? { message: error.message, onRetry: () => void mutate() } : null}
        empty={
          <EmptyState title={filtered ? 'No client matches' : 'No other system reads here'}>
            {filtered ? 'Take a filter away.' : 'Add one with the button above: it gets a token of its own.'}
          </EmptyState>
        }
      />
      <ConfirmDialog
        open={asked !== null}
        onOpenChange={(open) => (open ? undefined : setAsked(null))}
        title={
          asked?.act === 'revoke'
            ? `Revoke ${asked.row.name}`
            : `Rotate the secret of ${asked?.row.name ?? ''}`
        }
        confirmLabel={asked?.act === 'revoke' ? 'Revoke the client' : 'Make a new secret'}
        danger={asked?.act !== 'rotate'}
        {...(asked?.act === 'revoke' ? { reason: { label: 'Reason' } } : {})}
        onConfirm={({ reason }) => confirm(reason)}
      >
        {asked?.act === 'revoke' ? (
          <p>Its secret, its keys and its tokens stop at once. It cannot be taken back.</p>
        ) : (
          <>
            <p>
              {asked?.act === 'rotate'
                ? 'The secret it has now works for another day, so that nothing stops.'
                : 'The secret it has now stops at once: the other system reads nothing until it has the new one.'}
            </p>
            <p>
              <Button
                variant="quiet"
                onClick={() =>
                  asked && setAsked({ ...asked, act: asked.act === 'rotate' ? 'rotate-now' : 'rotate' })
                }
              >
                {asked?.act === 'rotate'
                  ? 'It is known to somebody: stop it at once'
                  : 'Let it work for another day'}
              </Button>
            </p>
          </>
        )}
      </ConfirmDialog>
      <ShownOnce
        title="The new secret"
        parts={secret === null ? null : [{ label: 'Secret', what: 'secret', text: secret.text }]}
        onClose={() => setSecret(null)}
      />
    </>
  );
}
