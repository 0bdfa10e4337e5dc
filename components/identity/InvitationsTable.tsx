'use client';

import { useRouter } from 'next/navigation';
import { useState } from 'react';
import { concerns } from '@/components/shell/LiveEvents';
import { sendJson, useData } from '@/components/shell/useData';
import { Button } from '@/components/ui/Button';
import { ConfirmDialog } from '@/components/ui/ConfirmDialog';
import { DataTable } from '@/components/ui/DataTable';
import { EmptyState } from '@/components/ui/EmptyState';
import { Pager } from '@/components/ui/Pager';
import { Time } from '@/components/ui/Time';
import { tell } from '@/components/ui/Toast';
import { type ColumnOf, tableOf } from '@/components/ui/tableRows';
import type { Role } from '@/lib/identity/permissions';
import { roleWords } from './roleWords';

export interface InvitationLine {
  id: string;
  name: string;
  email: string;
  roles: Role[];
  invitedBy: string;
  createdAt: number;
  expiresAt: number;
  acceptedAt: number | null;
  withdrawnAt: number | null;
}
export interface InvitationsAnswer {
  rows: InvitationLine[];
  next: string | null;
}
type View = 'open' | 'accepted' | 'withdrawn' | 'ended';
interface Chosen {
  line: InvitationLine;
  act: 'send-again' | 'withdraw';
}

const ENDS: Record<View, { header: string; at: (line: InvitationLine) => number | null }> = {
  open: { header: 'Works until', at: (line) => line.expiresAt },
  accepted: { header: 'Taken up', at: (line) => line.acceptedAt },
  withdrawn: { header: 'Withdrawn', at: (line) => line.withdrawnAt },
  ended: { header: 'Ended', at: (line) => line.expiresAt },
};

function columnsOf(view: View, choose: (chosen: Chosen) => void): ColumnOf<InvitationLine>[] {
  const columns: ColumnOf<InvitationLine>[] = [
    { id: 'name', header: 'Name', fixed: true, cell: (line) => <b>{line.name}</b> },
    { id: 'email', header: 'E-mail', maxWidth: '32ch', cell: (line) => line.email },
    { id: 'roles', header: 'Roles', wrap: true, cell: (line) => roleWords(line.roles) },
    { id: 'by', header: 'Invited by', cell: (line) => line.invitedBy },
    { id: 'sent', header: 'Sent', cell: (line) => <Time at={line.createdAt} ago /> },
    { id: 'end', header: ENDS[view].header, cell: (line) => <Time at={ENDS[view].at(line)} mode="minute" /> },
  ];
  if (view !== 'open') return columns;
  const buttons = (line: InvitationLine) => (
    <span className="flex gap-2">
      <Button size="small" onClick={() => choose({ line, act: 'send-again' })}>
        Send again
      </Button>
      <Button size="small" variant="danger" onClick={() => choose({ line, act: 'withdraw' })}>
        Withdraw
      </Button>
    </span>
  );
  return [...columns, { id: 'acts', header: 'Acts', fixed: true, cell: buttons }];
}

/** Invitations, the latest first; open ones can be sent again or withdrawn. */
export function InvitationsTable({
  view,
  query,
  first,
  firstHref,
  nextHref,
}: {
  view: View;
  query: string;
  first: InvitationsAnswer;
  firstHref: string | null;
  nextHref: string;
}) {
  const [chosen, setChosen] = useState<Chosen | null>(null);
  const { data, error, mutate } = useData<InvitationsAnswer>(`/api/invitations${query}`, first, (event) =>
    concerns(event, 'invitation'),
  );
  const answer = data ?? first;
  const table = tableOf(answer.rows, columnsOf(view, setChosen), {
    id: (line) => line.id,
    label: (line) => line.name,
  });
  return (
    <>
      <DataTable
        caption="Invitations"
        {...table}
        error={error ? { message: error.message, onRetry: () => void mutate() } : null}
        empty={
          <EmptyState title={view === 'open' ? 'No invitation is open' : 'None of these'}>
            Invite somebody with the button above: the mail holds an address that works once.
          </EmptyState>
        }
      />
      {firstHref || answer.next ? (
        <Pager
          newerLabel="Latest"
          newerHref={firstHref}
          olderHref={answer.next ? `${nextHref}after=${encodeURIComponent(answer.next)}` : null}
        />
      ) : null}
      <InvitationActs chosen={chosen} onClose={() => setChosen(null)} onDone={() => void mutate()} />
    </>
  );
}

function InvitationActs({
  chosen,
  onClose,
  onDone,
}: {
  chosen: Chosen | null;
  onClose: () => void;
  onDone: () => void;
}) {
  const router = useRouter();
  const again = chosen?.act === 'send-again';
  return (
    <ConfirmDialog
      open={chosen !== null}
      onOpenChange={(open) => (open ? undefined : onClose())}
      title={
        again
          ? `Send the invitation of ${chosen.line.name} again`
          : `Withdraw the invitation of ${chosen?.line.name ?? ''}`
      }
      confirmLabel={again ? 'Send it again' : 'Withdraw it'}
      danger={!again}
      onConfirm={async () => {
        if (!chosen) return;
        await sendJson(`/api/invitations/${chosen.line.id}/${chosen.act}`, {}, crypto.randomUUID());
        tell(again ? `Sent again to ${chosen.line.email}` : 'The invitation is withdrawn');
        onDone();
        router.refresh();
      }}
    >
      <p>
        {again
          ? `${chosen.line.email} gets a fresh address for another seven days. The one before stops working.`
          : 'The address in the mail stops working at once. You can invite them again later.'}
      </p>
    </ConfirmDialog>
  );
}
