import Link from 'next/link';
import { PassageStrip } from '@/components/custody/PassageStrip';
import { VerdictMark } from '@/components/recording/VerdictMark';
import { DataTable } from '@/components/ui/DataTable';
import { EmptyState } from '@/components/ui/EmptyState';
import { Time } from '@/components/ui/Time';
import { type ColumnOf, tableOf } from '@/components/ui/tableRows';
import { findingSentence } from '@/lib/acoustics/sentences';

interface Clip {
  id: string;
  number: string;
  stage: 'awaited' | 'received' | 'sealed' | 'measured' | 'filed';
  stopped: string | null;
  verdict: 'usable' | 'care' | 'repeat' | null;
  findings: Record<string, unknown>[] | null;
  recordedAt: number;
  durationSeconds: number | null;
}

const why = (clip: Clip) =>
  (clip.findings ?? [])
    .filter((finding) => finding.severity !== 'note')
    .map((finding) => findingSentence(finding as never).title)
    .join(', ');

/** A device's latest recordings, without a patient's name: for the bench it is the sound that counts. */
export function DeviceClips({ clips, linked }: { clips: readonly Clip[]; linked: boolean }) {
  const columns: ColumnOf<Clip>[] = [
    {
      id: 'number',
      header: 'Recording',
      cell: (c) =>
        linked ? (
          <Link className="link-quiet mono" href={`/recordings/${c.number}`}>
            {c.number}
          </Link>
        ) : (
          <span className="mono">{c.number}</span>
        ),
    },
    { id: 'recorded', header: 'Recorded', cell: (c) => <Time at={c.recordedAt} mode="minute" /> },
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
    { id: 'why', header: 'Why', maxWidth: '32ch', cell: why, title: why },
  ];
  const table = tableOf(clips, columns, {
    id: (c) => c.id,
    label: (c) => c.number,
    href: (c) => (linked ? `/recordings/${c.number}` : undefined),
  });
  return (
    <DataTable
      caption="Recordings of this device"
      {...table}
      empty={
        <EmptyState title="No recordings yet">
          The first one shows here as soon as the device sends it.
        </EmptyState>
      }
    />
  );
}
