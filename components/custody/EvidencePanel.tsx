'use client';

import { useRouter } from 'next/navigation';
import { useState } from 'react';
import { sendJson } from '@/components/shell/useData';
import { Button, buttonClass } from '@/components/ui/Button';
import { ConfirmDialog } from '@/components/ui/ConfirmDialog';
import { Notice } from '@/components/ui/Notice';
import { Panel } from '@/components/ui/Panel';
import { Time } from '@/components/ui/Time';

interface Request {
  id: string;
  reason: string;
  askedBy: { id: string; name: string };
  askedAt: number;
  decision: 'not-needed' | 'approved' | 'refused' | null;
  decidedAt: number | null;
}

const packageHref = (id: string) => `/api/ledger/evidence/${id}`;

/** As a download, so that a refusal leaves the page where it is. */
function takeAway(id: string): void {
  const link = document.createElement('a');
  link.href = packageHref(id);
  link.download = '';
  link.click();
}

/** The button, and the question for a reason. What is open at once is taken away at once. */
export function MakeEvidence({ number, sealed }: { number: string; sealed: boolean }) {
  const [open, setOpen] = useState(false);
  const router = useRouter();
  if (!sealed)
    return (
      <Button variant="primary" disabled title="Nothing is sealed yet">
        Make an evidence package…
      </Button>
    );
  return (
    <>
      <Button variant="primary" onClick={() => setOpen(true)}>
        Make an evidence package…
      </Button>
      <ConfirmDialog
        open={open}
        onOpenChange={setOpen}
        title={`Evidence of ${number}`}
        confirmLabel="Make the package"
        danger={false}
        reason={{
          label: 'Why it is taken out of the house',
          help: 'It stands in the package and in this thread.',
        }}
        onConfirm={async ({ reason }) => {
          const answer = await sendJson<{ id: string; state: 'waiting' | 'open' }>(
            `/api/ledger/recordings/${number}/evidence`,
            { reason },
            crypto.randomUUID(),
          );
          if (answer.state === 'open') takeAway(answer.id);
          router.refresh();
        }}
      >
        <p>
          An archive with the original, its pictures, every entry with its proof, the signed heads, the keys
          and a report. It verifies without Bellkeep and without a network.
        </p>
        <p>Where policy asks for a second person, another auditor decides first.</p>
      </ConfirmDialog>
    </>
  );
}

const STATES = {
  'not-needed': { word: 'open', tone: 'text-spruce' },
  approved: { word: 'approved', tone: 'text-spruce' },
  refused: { word: 'refused', tone: 'text-rust' },
  waiting: { word: 'waits for a second person', tone: 'text-brass' },
} as const;

/** What was asked for, and what one may do about it. */
export function EvidencePanel({ requests, personId }: { requests: readonly Request[]; personId: string }) {
  return (
    <Panel title="Evidence packages" flush>
      <ul className="px-[18px] py-1.5">
        {requests.map((request) => (
          <RequestLine key={request.id} request={request} mine={request.askedBy.id === personId} />
        ))}
      </ul>
    </Panel>
  );
}

function RequestLine({ request, mine }: { request: Request; mine: boolean }) {
  const { word, tone } = STATES[request.decision ?? 'waiting'];
  const open = request.decision === 'not-needed' || request.decision === 'approved';
  return (
    <li className="grid gap-1.5 border-b border-line py-2.5 last:border-0">
      <p className="[overflow-wrap:anywhere]">“{request.reason}”</p>
      <p className="text-13 text-ink-soft">
        {request.askedBy.name}, <Time at={request.askedAt} mode="minute" withZone />.{' '}
        <span className={`font-semibold ${tone}`}>{word}</span>
      </p>
      {open && mine ? (
        <p>
          <a className={buttonClass('plain', 'small')} href={packageHref(request.id)} download>
            Take it away
          </a>
        </p>
      ) : null}
      {request.decision === null && !mine ? <Decide id={request.id} /> : null}
    </li>
  );
}

function Decide({ id }: { id: string }) {
  const router = useRouter();
  const [busy, setBusy] = useState(false);
  const [failure, setFailure] = useState<string | null>(null);
  const decide = async (approve: boolean) => {
    setBusy(true);
    setFailure(null);
    try {
      await sendJson(`/api/ledger/evidence/${id}/decide`, { approve }, crypto.randomUUID());
      router.refresh();
    } catch (error) {
      setFailure(error instanceof Error ? error.message : 'It was not done. Try again.');
    } finally {
      setBusy(false);
    }
  };
  return (
    <div className="grid gap-2">
      <div className="flex flex-wrap gap-2">
        <Button size="small" busy={busy} onClick={() => decide(true)}>
          Approve
        </Button>
        <Button size="small" variant="danger" busy={busy} onClick={() => decide(false)}>
          Refuse
        </Button>
      </div>
      {failure ? <Notice tone="alarm">{failure}</Notice> : null}
    </div>
  );
}
