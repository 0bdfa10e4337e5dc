'use client';

import Link from 'next/link';
import type { ReactNode } from 'react';
import { PassageStrip } from '@/components/custody/PassageStrip';
import { VerdictMark } from '@/components/recording/VerdictMark';
import { concerns } from '@/components/shell/LiveEvents';
import { useData } from '@/components/shell/useData';
import { DataTable } from '@/components/ui/DataTable';
import { Time } from '@/components/ui/Time';
import { type ColumnOf, tableOf } from '@/components/ui/tableRows';
import { findingSentence } from '@/lib/acoustics/sentences';
import { siteOf } from '@/lib/contract/sites';
import type { Clip } from './session';

export interface ClipRow extends Clip {
  assetTag: string;
  patientName?: string;
  recordNumber?: string;
  encounterNumber?: string;
  encounterId?: string;
}

const worst = (clip: ClipRow) => {
  const told = (clip.findings ?? []).filter((finding) => finding.severity !== 'note');
  return told.map((finding) => findingSentence(finding).title).join(', ');
};

const COLUMNS: ColumnOf<ClipRow>[] = [
  {
    id: 'number',
    header: 'Recording',
    fixed: true,
    cell: (c) => (
      <Link className="link-quiet mono" href={`/recordings/${c.number}`}>
        {c.number}
      </Link>
    ),
  },
  { id: 'patient', header: 'Patient', maxWidth: '26ch', cell: (c) => c.patientName ?? '' },
  { id: 'record', header: 'Record', cell: (c) => <span className="mono">{c.recordNumber}</span> },
  {
    id: 'encounter',
    header: 'Encounter',
    cell: (c) =>
      c.encounterId ? (
        <Link className="link mono" href={`/encounters/${c.encounterId}`}>
          {c.encounterNumber}
        </Link>
      ) : (
        ''
      ),
  },
  { id: 'site', header: 'Site', maxWidth: '20ch', cell: (c) => siteOf(c.site)?.label ?? 'not given' },
  { id: 'recorded', header: 'Recorded', cell: (c) => <Time at={c.recordedAt} /> },
  {
    id: 'length',
    header: 'Length',
    align: 'right',
    cell: (c) => (c.durationSeconds === null ? '' : `${c.durationSeconds.toFixed(1)} s`),
  },
  {
    id: 'passage',
    header: 'Passage',
    cell: (c) => <PassageStrip stage={c.stage} stopped={c.stopped !== null} verdict={c.verdict} />,
  },
  { id: 'verdict', header: 'Verdict', cell: (c) => (c.verdict ? <VerdictMark verdict={c.verdict} /> : '') },
  { id: 'why', header: 'Why', maxWidth: '26ch', cell: worst, title: worst },
  { id: 'device', header: 'Device', cell: (c) => <span className="mono">{c.assetTag}</span> },
];

/** Clips as rows; with the patient's columns where the clips are of several. */
export function ClipsTable({
  href,
  first,
  withPatient,
  empty,
  olderHref = null,
  newerHref = null,
}: {
  /** Where the rows are asked for again; null: the page itself draws them anew. */
  href: string | null;
  first: { rows: ClipRow[] };
  withPatient: boolean;
  empty: ReactNode;
  olderHref?: string | null;
  newerHref?: string | null;
}) {
  const { data, error, mutate } = useData<{ rows: ClipRow[] }>(href, first, (event) =>
    concerns(event, 'recording'),
  );
  const columns = COLUMNS.filter(({ id }) => withPatient || !['patient', 'record', 'encounter'].includes(id));
  const table = tableOf(data?.rows ?? [], columns, {
    id: (c) => c.id,
    label: (c) => c.number,
    href: (c) => `/recordings/${c.number}`,
  });
  return (
    <DataTable
      caption="Recordings"
      tableId={withPatient ? 'recordings' : 'clips'}
      {...table}
      empty={empty}
      error={error && !data ? { message: error.message, onRetry: () => void mutate() } : null}
      olderHref={olderHref}
      newerHref={newerHref}
    />
  );
}
