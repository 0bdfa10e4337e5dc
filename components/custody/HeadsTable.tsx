'use client';

import { useState } from 'react';
import { Button } from '@/components/ui/Button';
import { DataTable } from '@/components/ui/DataTable';
import { EmptyState } from '@/components/ui/EmptyState';
import { Notice } from '@/components/ui/Notice';
import { Time } from '@/components/ui/Time';
import { type ColumnOf, tableOf } from '@/components/ui/tableRows';
import { useTableSelection } from '@/components/ui/useTableSelection';
import { compareHeads } from '@/lib/custody/pure/compareHeads';
import { CustodyError } from '@/lib/custody/pure/errors';
import { consistencyPath, publishedKeys } from './verifySources';

interface HeadLine {
  size: number;
  root: string;
  note: string;
  madeAt: number;
}

const COLUMNS: ColumnOf<HeadLine>[] = [
  {
    id: 'size',
    header: 'Entries',
    align: 'right',
    fixed: true,
    cell: (head) => <span className="font-mono">{head.size.toLocaleString('en-GB')}</span>,
  },
  { id: 'madeAt', header: 'Signed', cell: (head) => <Time at={head.madeAt} mode="second" withZone /> },
  {
    id: 'root',
    header: 'Root',
    cell: (head) => (
      <span className="font-mono">
        {head.root.slice(0, 16)}…{head.root.slice(-8)}
      </span>
    ),
    title: (head) => head.root,
  },
  {
    id: 'note',
    header: 'As it is signed',
    wrap: true,
    cell: (head) => (
      <details>
        <summary className="cursor-pointer">Show</summary>
        <pre className="mt-1 max-w-[64ch] whitespace-pre-wrap break-all font-mono text-13 select-all">
          {head.note}
        </pre>
      </details>
    ),
  },
];

interface Result {
  tone: 'good' | 'alarm' | 'care';
  title: string;
  text: string;
}

/** Tree heads; of two that are selected, the reader's browser checks signatures and consistency. */
export function HeadsTable({
  origin,
  rows,
  olderHref,
  newerHref,
}: {
  origin: string;
  rows: readonly HeadLine[];
  olderHref: string | null;
  newerHref: string | null;
}) {
  const [result, setResult] = useState<Result | null>(null);
  const table = tableOf(rows, COLUMNS, {
    id: (head) => String(head.size),
    label: (head) => `the head of ${head.size} entries`,
  });
  const notes = new Map(rows.map((head) => [String(head.size), head.note]));
  return (
    <>
      {result ? (
        <Notice tone={result.tone} title={result.title} live className="mb-4">
          {result.text}
        </Notice>
      ) : null}
      <DataTable
        caption="Tree heads"
        tableId="heads"
        {...table}
        noun={['head', 'heads']}
        actions={<Compare origin={origin} notes={notes} onResult={setResult} />}
        olderHref={olderHref}
        newerHref={newerHref}
        empty={
          <EmptyState title="No heads here">
            The first head is signed within a minute of the first entry, and then one for each minute in which
            something happened.
          </EmptyState>
        }
      />
    </>
  );
}

function Compare({
  origin,
  notes,
  onResult,
}: {
  origin: string;
  notes: ReadonlyMap<string, string>;
  onResult: (result: Result) => void;
}) {
  const { ids } = useTableSelection();
  const [busy, setBusy] = useState(false);
  const [first, second] = ids.map((id) => notes.get(id));
  const compare = async () => {
    if (first === undefined || second === undefined) return;
    setBusy(true);
    onResult(await resultOf([first, second], origin));
    setBusy(false);
  };
  return (
    <Button variant="bar" disabled={ids.length !== 2} busy={busy} busyLabel="Checking" onClick={compare}>
      {ids.length === 2 ? 'Check that one follows the other' : 'Choose two'}
    </Button>
  );
}

async function resultOf(notes: [string, string], origin: string): Promise<Result> {
  try {
    const { from, to, hashes } = await compareHeads(notes, origin, await publishedKeys(), consistencyPath);
    return {
      tone: 'good',
      title: 'One follows the other',
      text: `All ${from.toLocaleString('en-GB')} entries of the earlier head stand unchanged and in order within the ${to.toLocaleString('en-GB')} of the later one. Both signatures hold. Checked in this browser by ${hashes} hashes.`,
    };
  } catch (error) {
    if (error instanceof CustodyError && error.code !== 'ed25519-missing')
      return {
        tone: 'alarm',
        title: 'They do not belong to one log',
        text: `${error.message}. Keep both and tell IT: one of them was replaced, or the log was.`,
      };
    return {
      tone: 'care',
      title: 'Not checked',
      text:
        error instanceof CustodyError
          ? 'This browser does not check Ed25519 signatures. Use a current one, or the evidence package and openssl.'
          : `${error instanceof Error ? error.message : 'No answer'}. Try again.`,
    };
  }
}
