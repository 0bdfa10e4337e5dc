'use client';

import Link from 'next/link';
import type { ReactNode } from 'react';
import { PassageStrip } from '@/components/custody/PassageStrip';
import { worstFirst } from '@/components/recording/FindingsTable';
import { VerdictMark } from '@/components/recording/VerdictMark';
import { useData } from '@/components/shell/useData';
import { DataTable } from '@/components/ui/DataTable';
import { Pager } from '@/components/ui/Pager';
import { Time } from '@/components/ui/Time';
import { type ColumnOf, tableOf } from '@/components/ui/tableRows';
import { findingSentence } from '@/lib/acoustics/sentences';
import { siteOf } from '@/lib/contract/sites';
import { changed } from './live';
import type { Clip } from './session';
import { listNameOf } from './words';

export interface ClipRow extends Clip {
  encounterId?: string;
  encounterNumber?: string;
  givenName?: string;
  familyName?: string;
  recordNumber?: string;
}

const TAP = 'inline-flex min-h-11 items-center';
const patientOf = ({ familyName = '', givenName = '' }: ClipRow): string =>
  familyName === '' ? '' : listNameOf({ familyName, givenName });

const whyOf = (clip: ClipRow): string => {
  const told = worstFirst(clip.findings).filter((finding) => finding.severity !== 'note');
  return told.map((finding) => findingSentence(finding).title).join(', ');
};

const COLUMNS: ColumnOf<ClipRow>[] = [
  {
    id: 'number',
    header: 'Recording',
    fixed: true,
    cell: (c) => (
      <Link className={`link-quiet mono ${TAP}`} href={`/recordings/${c.number}`}>
        {c.number}
      </Link>
    ),
  },
  {
    id: 'verdict',
    header: 'Verdict',
    cell: (c) => (
      <>
        {c.verdict ? <VerdictMark verdict={c.verdict} /> : ''}
        {c.keptAt === null ? '' : <span className="text-13 text-ink-soft"> kept</span>}
      </>
    ),
  },
  { id: 'patient', header: 'Patient', maxWidth: '22ch', cell: patientOf },
  { id: 'record', header: 'Record', cell: (c) => <span className="mono">{c.recordNumber}</span> },
  { id: 'site', header: 'Site', maxWidth: '18ch', cell: (c) => siteOf(c.site)?.label ?? 'not given' },
  { id: 'recorded', header: 'Recorded', cell: (c) => <Time at={c.recordedAt} /> },
  {
    id: 'passage',
    header: 'Passage',
    cell: (c) => <PassageStrip stage={c.stage} stopped={c.stopped !== null} verdict={c.verdict} />,
  },
  { id: 'why', header: 'Why', maxWidth: '26ch', cell: whyOf, title: whyOf },
  {
    id: 'length',
    header: 'Length',
    align: 'right',
    cell: (c) => (c.durationSeconds === null ? '' : `${c.durationSeconds.toFixed(1)} s`),
  },
  { id: 'device', header: 'Device', cell: (c) => <span className="mono">{c.assetTag}</span> },
  {
    id: 'encounter',
    header: 'Encounter',
    cell: (c) =>
      c.encounterId ? (
        <Link className={`link mono ${TAP}`} href={`/encounters/${c.encounterId}`}>
          {c.encounterNumber}
        </Link>
      ) : (
        ''
      ),
  },
];
const OF_PATIENT = ['patient', 'record', 'encounter'];

interface Props {
  /** Where the rows are asked for again; null: the page itself draws them anew. */
  href: string | null;
  first: { rows: ClipRow[] };
  withPatient: boolean;
  empty: ReactNode;
  olderHref?: string | null;
  newerHref?: string | null;
}

/** Clips as rows, with the patient where they are of several; on a phone as lines. */
export function ClipsTable({ href, first, withPatient, empty, olderHref = null, newerHref = null }: Props) {
  const { data, error, mutate } = useData<{ rows: ClipRow[] }>(href, first, (event) =>
    changed(event, 'recording'),
  );
  const rows = (href === null ? first : data)?.rows ?? [];
  const table = tableOf(
    rows,
    COLUMNS.filter(({ id }) => withPatient || !OF_PATIENT.includes(id)),
    { id: (c) => c.id, label: (c) => c.number, href: (c) => `/recordings/${c.number}` },
  );
  const failed = error && !data ? { message: error.message, onRetry: () => void mutate() } : null;
  return (
    <div className="min-w-0">
      <div className="max-[640px]:hidden">
        <DataTable
          caption="Recordings"
          tableId={withPatient ? 'recordings' : 'clips'}
          {...table}
          empty={empty}
          error={failed}
        />
      </div>
      <div className="min-[641px]:hidden">
        {rows.length === 0 ? (failed?.message ?? empty) : <PhoneList rows={rows} />}
      </div>
      {olderHref || newerHref ? <Pager olderHref={olderHref} newerHref={newerHref} /> : null}
    </div>
  );
}

function PhoneList({ rows }: { rows: readonly ClipRow[] }) {
  return (
    <ul aria-label="Recordings" className="rounded-plate border border-line bg-sheet">
      {rows.map((clip) => (
        <li key={clip.id} className="border-b border-line last:border-b-0">
          <Link
            href={`/recordings/${clip.number}`}
            className="grid min-h-[52px] gap-0.5 px-4 py-2.5 text-ink no-underline"
          >
            <span className="flex flex-wrap items-center justify-between gap-x-4">
              <b className="mono text-spruce">{clip.number}</b>
              {clip.verdict ? <VerdictMark verdict={clip.verdict} /> : null}
            </span>
            <span className="min-w-0 break-words">
              {[patientOf(clip), siteOf(clip.site)?.label ?? 'no site given'].filter(Boolean).join(' · ')}
            </span>
            <span className="flex flex-wrap items-center gap-x-4 text-13 text-ink-soft">
              <PassageStrip stage={clip.stage} stopped={clip.stopped !== null} verdict={clip.verdict} />
              <Time at={clip.recordedAt} ago className="" />
              <span>{whyOf(clip)}</span>
            </span>
          </Link>
        </li>
      ))}
    </ul>
  );
}
