import Link from 'next/link';
import { bornInWords, nameOf } from '@/components/bedside/words';
import { Time } from '@/components/ui/Time';
import { siteOf } from '@/lib/contract/sites';
import { figure } from './figures';

export interface RecordingInSentence {
  site: string | null;
  stage: string;
  stopped: string | null;
  recordedAt: number;
  durationSeconds: number | null;
  device: { id: string; assetTag: string };
  filing: { encounterId: string } | null;
  patient: {
    id: string;
    givenName: string;
    familyName: string;
    birthDate: string | null;
    recordNumber: string;
  } | null;
}

/** What a recording is, in one sentence: where, of whom, when, with what. */
export function RecordingSentence({
  recording: r,
  auditor,
}: {
  recording: RecordingInSentence;
  auditor: boolean;
}) {
  return (
    <>
      {siteOf(r.site)?.label ?? 'No site given'}
      <OfWhom recording={r} auditor={auditor} /> Recorded{' '}
      <Time at={r.recordedAt} mode="second" withZone className="" /> with{' '}
      <Link className="mono" href={`/devices/${r.device.id}`}>
        {r.device.assetTag}
      </Link>
      {r.durationSeconds === null ? '' : `, ${figure(r.durationSeconds, 1)} s`}.
    </>
  );
}

function OfWhom({ recording: r, auditor }: { recording: RecordingInSentence; auditor: boolean }) {
  if (r.patient && r.filing)
    return (
      <>
        {' '}
        of{' '}
        <Link href={auditor ? `/ledger/patient/${r.patient.id}` : `/encounters/${r.filing.encounterId}`}>
          {nameOf(r.patient)}
        </Link>
        , born {bornInWords(r.patient.birthDate)}, record{' '}
        <span className="mono">{r.patient.recordNumber}</span>.
      </>
    );
  if (r.stopped !== null)
    return <>. The bytes that arrived are not the ones announced; they are kept in quarantine.</>;
  return r.stage === 'measured' ? (
    <>. It is in the tray: nothing ties it to an encounter yet.</>
  ) : (
    <>. It is on its way: {r.stage}.</>
  );
}
