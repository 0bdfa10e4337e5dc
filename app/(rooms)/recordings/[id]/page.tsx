import type { Metadata } from 'next';
import Link from 'next/link';
import { notFound } from 'next/navigation';
import { bornInWords, nameOf } from '@/components/bedside/words';
import { PassageStripFull } from '@/components/custody/PassageStrip';
import { Caution } from '@/components/recording/Caution';
import type { ShownFinding } from '@/components/recording/FindingsTable';
import { figure } from '@/components/recording/figures';
import { MeasuresList } from '@/components/recording/MeasuresList';
import { MoveFiling } from '@/components/recording/MoveFiling';
import { RecordingBody } from '@/components/recording/RecordingBody';
import { VerdictMark } from '@/components/recording/VerdictMark';
import { LiveRefresh } from '@/components/shell/LiveEvents';
import { DefinitionList } from '@/components/ui/DefinitionList';
import { PageHead } from '@/components/ui/PageHead';
import { Section } from '@/components/ui/Panel';
import { Time } from '@/components/ui/Time';
import type { Measures } from '@/lib/acoustics/types';
import { siteOf } from '@/lib/contract/sites';
import { noteAccess } from '@/lib/custody/noteAccess';
import { requirePage } from '@/lib/http/page';
import { reachRecording } from '@/lib/http/reach';
import { type RecordingView, recordingView } from '@/lib/http/recordingView';
import { may } from '@/lib/identity/permissions';
import { personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';

type Props = { params: Promise<{ id: string }> };

export async function generateMetadata({ params }: Props): Promise<Metadata> {
  return { title: `Recording ${(await params).id.toUpperCase()}` };
}

const BY: Record<string, (r: NonNullable<RecordingView['filing']>) => string> = {
  session: (f) => `by session ${f.session ?? ''}`,
  identifier: () => 'by scanned identifier',
  person: (f) => `by ${f.person ?? 'a person'}`,
};

/** One recording: look, listen, what is wrong with it, where it is filed. Looking is an entry in its thread. */
export default async function RecordingPage({ params }: Props) {
  const { person, services } = await requirePage('recording.read');
  const clip = await reachRecording(services, person, (await params).id).catch((error: unknown) => {
    if (error instanceof Refusal) notFound();
    throw error;
  });
  await noteAccess(services, 'looked-at', personActor(person, 'recording.read'), clip.recording, {
    subjects: clip.patient ? [{ kind: 'patient', id: clip.patient.id }] : [],
  });
  const r = recordingView(clip);
  const thread = (
    <Link className="link" href={`/ledger/recordings/${r.number}`}>
      thread of {r.entries}
    </Link>
  );
  return (
    <>
      <LiveRefresh subjects={[{ kind: 'recording', id: r.id }]} />
      <PageHead title={`Recording ${r.number}`}>
        <Sentence r={r} auditor={!may(person.roles, 'bedside.read')} />
      </PageHead>
      <div className="grid gap-x-6 gap-y-8 plate:grid-cols-[minmax(0,1fr)_316px]">
        <div className="grid min-w-0 content-start gap-6">
          <RecordingBody
            number={r.number}
            durationSeconds={r.durationSeconds ?? 0}
            hasPictures={r.pictures.length > 0}
            findings={r.findings as unknown as ShownFinding[]}
            measures={r.measures as Partial<Measures> | null}
          >
            <PassageStripFull
              stage={r.stage}
              stopped={r.stopped !== null}
              verdict={r.verdict}
              steps={{
                awaited: { at: r.awaitedAt },
                received: { at: r.receivedAt },
                sealed: {
                  at: r.sealedAt,
                  detail: r.sealedAt ? (
                    <span className="mono text-ink-soft">
                      {r.sha256.slice(0, 4)}…{r.sha256.slice(-4)}
                    </span>
                  ) : null,
                },
                measured: {
                  at: r.measuredAt,
                  detail: r.verdict ? <VerdictMark verdict={r.verdict} /> : null,
                },
                filed: {
                  at: r.filedAt,
                  detail: r.filing ? (
                    <>
                      {BY[r.filing.by]?.(r.filing)} · {thread}
                    </>
                  ) : (
                    thread
                  ),
                },
              }}
            />
          </RecordingBody>
          <Caution places />
        </div>
        <aside className="grid content-start gap-6">
          {r.measures ? (
            <Section title="Measures">
              <MeasuresList
                measures={r.measures as never}
                expectedSampleRatesHz={r.device.expectedSampleRatesHz}
              />
            </Section>
          ) : null}
          <Section title="The recording">
            <DefinitionList
              facts={[
                {
                  term: 'Device',
                  value: (
                    <Link className="link mono" href={`/devices/${r.device.id}`}>
                      {r.device.assetTag}
                    </Link>
                  ),
                },
                { term: 'Model', value: r.device.model },
                { term: 'Firmware', value: r.firmware },
                { term: 'Side', value: r.chestpieceSide },
                { term: 'Gain step', value: r.gainStep === null ? null : String(r.gainStep) },
                { term: 'Filter', value: r.filter },
                {
                  term: 'Device clock',
                  value:
                    Math.abs(r.clockOffsetMs) < 1000
                      ? 'right'
                      : `${figure(Math.abs(r.clockOffsetMs) / 1000, 1)} s ${r.clockOffsetMs < 0 ? 'slow' : 'fast'}`,
                },
                { term: 'SHA-256', value: <code className="break-all text-13">{r.sha256}</code> },
                { term: 'Kept anyway', value: r.keptReason },
              ]}
            />
          </Section>
          <div className="grid justify-items-start gap-2">
            {r.sealedAt ? (
              <a className="link" href={`/api/recordings/${r.number}/original`} download>
                Download the original
              </a>
            ) : null}
            {may(person.roles, 'filing.write') &&
            (r.stage === 'filed' || r.stage === 'measured') &&
            r.stopped === null ? (
              <MoveFiling number={r.number} from={r.filing?.encounterNumber ?? null} />
            ) : null}
          </div>
        </aside>
      </div>
    </>
  );
}

function Sentence({ r, auditor }: { r: RecordingView; auditor: boolean }) {
  const site = siteOf(r.site);
  return (
    <>
      {site ? site.label : 'No site given'}
      {r.patient && r.filing ? (
        <>
          {' '}
          of{' '}
          <Link href={auditor ? `/ledger/patient/${r.patient.id}` : `/encounters/${r.filing.encounterId}`}>
            {nameOf(r.patient)}
          </Link>
          , born {bornInWords(r.patient.birthDate)}, record{' '}
          <span className="mono">{r.patient.recordNumber}</span>.
        </>
      ) : r.stopped ? (
        '. The bytes that arrived are not the ones announced; they are in quarantine.'
      ) : (
        '. It is in the tray: nothing ties it to an encounter yet.'
      )}{' '}
      Recorded <Time at={r.recordedAt} mode="second" withZone /> with{' '}
      <Link className="mono" href={`/devices/${r.device.id}`}>
        {r.device.assetTag}
      </Link>
      {r.durationSeconds === null ? '' : `, ${figure(r.durationSeconds, 1)} s`}.
    </>
  );
}
