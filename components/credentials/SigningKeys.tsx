'use client';

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

export interface KeyRow {
  kid: string;
  use: 'device-token' | 'client-token' | 'tree-head';
  algorithm: string;
  createdAt: number;
  supersededAt: number | null;
  retiredAt: number | null;
  compromisedAt: number | null;
  living: number;
}

const USES: Record<KeyRow['use'], string> = {
  'device-token': 'device tokens',
  'client-token': 'tokens of API clients',
  'tree-head': 'tree heads',
};

const isCurrent = (key: KeyRow) => key.supersededAt === null && key.retiredAt === null;

function Life({ row }: { row: KeyRow }) {
  if (row.compromisedAt !== null)
    return (
      <span className="font-semibold text-rust">
        Distrusted <Time at={row.compromisedAt} ago />
      </span>
    );
  if (row.retiredAt !== null)
    return (
      <>
        Retired <Time at={row.retiredAt} ago />
      </>
    );
  return row.supersededAt === null ? <>Signs</> : <>Superseded, still verifies</>;
}

type Asked = { row: KeyRow; act: 'rotate' | 'distrust' };

/** The service's own keys: which signs, which still verifies, and how many credentials hang on each. */
export function SigningKeys({ first }: { first: { rows: KeyRow[] } }) {
  const { data, error, mutate } = useData<{ rows: KeyRow[] }>(
    '/api/signing-keys',
    first,
    (event) => concerns(event, 'signing-key') || concerns(event, 'credential'),
  );
  const [asked, setAsked] = useState<Asked | null>(null);
  const columns: ColumnOf<KeyRow>[] = [
    {
      id: 'kid',
      header: 'Key',
      fixed: true,
      cell: (key) => <CopyText text={key.kid} what="key id" shown={`${key.kid.slice(0, 10)}…`} />,
    },
    { id: 'use', header: 'Signs', cell: (key) => USES[key.use] },
    { id: 'life', header: 'Life', cell: (key) => <Life row={key} /> },
    {
      id: 'living',
      header: 'Living credentials',
      cell: (key) => (key.use === 'device-token' ? key.living.toLocaleString('en-GB') : 'none'),
    },
    { id: 'algorithm', header: 'Algorithm', cell: (key) => key.algorithm },
    { id: 'made', header: 'Made', cell: (key) => <Time at={key.createdAt} mode="minute" /> },
    {
      id: 'acts',
      header: 'Act',
      cell: (key) =>
        key.use === 'device-token' && key.retiredAt === null ? (
          <span className="flex gap-2">
            {isCurrent(key) ? (
              <Button size="small" onClick={() => setAsked({ row: key, act: 'rotate' })}>
                Rotate…
              </Button>
            ) : null}
            <Button size="small" variant="danger" onClick={() => setAsked({ row: key, act: 'distrust' })}>
              It leaked…
            </Button>
          </span>
        ) : null,
    },
  ];
  const table = tableOf(data?.rows ?? [], columns, { id: (key) => key.kid, label: (key) => key.kid });
  return (
    <>
      <DataTable
        caption="Signing keys"
        tableId="signing-keys"
        {...table}
        olderHref={null}
        newerHref={null}
        error={error && !data ? { message: error.message, onRetry: () => void mutate() } : null}
        empty={<EmptyState title="No key yet">The first is made when the service starts.</EmptyState>}
      />
      <ConfirmDialog
        open={asked !== null}
        onOpenChange={(open) => (open ? undefined : setAsked(null))}
        title={asked?.act === 'distrust' ? 'Trust this key no more' : 'Rotate the signing key'}
        confirmLabel={asked?.act === 'distrust' ? 'Trust it no more' : 'Rotate the key'}
        danger={asked?.act === 'distrust'}
        reason={{ label: 'Reason', help: 'It stands in the custody log with your name.' }}
        onConfirm={async ({ reason }) => {
          if (!asked) return;
          await sendJson(
            `/api/signing-keys/${asked.act}`,
            { kid: asked.row.kid, reason },
            crypto.randomUUID(),
          );
          tell(asked.act === 'distrust' ? 'The key is trusted no more' : 'Another key signs from now on');
          void mutate();
        }}
      >
        {asked?.act === 'distrust' ? (
          <p>
            Every token it signed is refused from this moment, whoever shows it. Devices with keys of their
            own renew with their next call, without a visit and without losing a clip; devices that only bear
            a token must be enrolled again. It cannot be taken back.
          </p>
        ) : (
          <p>
            A fresh key signs from now on. This one is published and verifies until the last of its{' '}
            {asked?.row.living ?? 0} living credentials has ended or was renewed, so no device notices. Start
            a rotation run to hasten that.
          </p>
        )}
      </ConfirmDialog>
    </>
  );
}
