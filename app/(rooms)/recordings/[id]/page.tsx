import type { Metadata } from 'next';
import Link from 'next/link';
import { PassageStripFull } from '@/components/custody/PassageStrip';
import { Caution } from '@/components/recording/Caution';
import { figure } from '@/components/recording/figures';
import { KeepClip } from '@/components/recording/KeepClip';
import { MeasuresList } from '@/components/recording/MeasuresList';
import { MoveFiling } from '@/components/recording/MoveFiling';
import { RecordingBody } from '@/components/recording/RecordingBody';
import { RecordingSentence } from '@/components/recording/RecordingSentence';
import { VerdictMark } from '@/components/recording/VerdictMark';
import { LiveRefresh } from '@/components/shell/LiveEvents';
import { DefinitionList } from '@/components/ui/DefinitionList';
import { PageHead } from '@/components/ui/PageHead';
import { Section } from '@/components/ui/Panel';
import { Time } from '@/components/ui/Time';
import type { Measures } from '@/lib/acoustics/types';
import { orNotFound, requirePage } from '@/lib/http/page';
import { openRecording } from '@/lib/http/reach';
import { type RecordingView, recordingView } from '@/lib/http/recordingView';
import { may } from '@/lib/identity/permissions';
import type { Person } from '@/lib/platform/authority';

type Props = { params: Promise<{ id: string }> };

export async function generateMetadata({ params }: Props): Promise<Metadata> {
  return { title: `Recording ${(await params).id.toUpperCase()}` };
}

/** One recording: look, listen, what is wrong with it, where it is filed. Looking is an entry in its thread. */
export default async function RecordingPage({ params }: Props) {
  const { person, services } = await requirePage('recording.read');
  const r = recordingView(await orNotFound(openRecording(services, person, (await params).id, 'looked-at')));
  return (
    <>
      <LiveRefresh subjects={[{ kind: 'recording', id: r.id }]} />
      <PageHead title={`Recording ${r.number}`}>
        <RecordingSentence recording={r} auditor={!may(person.roles, 'bedside.read')} />
      </PageHead>
      <RecordingBody
        key={r.id}
        number={r.number}
        durationSeconds={r.durationSeconds ?? 0}
        pictures={r.pictures}
        findings={r.findings}
        measures={r.measures as Partial<Measures> | null}
        passage={<Passage r={r} />}
        below={<Caution places />}
        beside={
          <>
            {r.measures ? (
              <Section title="Measures">
                <MeasuresList
                  measures={r.measures as Partial<Measures>}
                  expectedSampleRatesHz={r.device.expectedSampleRatesHz}
                />
              </Section>
            ) : null}
            <Section title="The recording">
              <Facts r={r} />
            </Section>
            <Acts r={r} person={person} />
          </>
        }
      />
    </>
  );
}

const FILED_BY: Record<string, (filing: NonNullable<RecordingView['filing']>) => string> = {
  session: (filing) => `by session ${filing.session ?? ''}`,
  identifier: () => 'by the scanned identifier',
  person: (filing) => `by ${filing.person ?? 'a person'}`,
};

function Passage({ r }: { r: RecordingView }) {
  const thread = (
    <Link className="link" href={`/ledger/recordings/${r.number}`}>
      thread of {r.entries}
    </Link>
  );
  const hash = (
    <span className="mono text-ink-soft">
      {r.sha256.slice(0, 4)}…{r.sha256.slice(-4)}
    </span>
  );
  return (
    <PassageStripFull
      stage={r.stage}
      stopped={r.stopped !== null}
      verdict={r.verdict}
      steps={{
        awaited: { at: r.awaitedAt },
        received: { at: r.receivedAt },
        sealed: { at: r.sealedAt, detail: r.sealedAt ? hash : null },
        measured: { at: r.measuredAt, detail: r.verdict ? <VerdictMark verdict={r.verdict} /> : null },
        filed: {
          at: r.filedAt,
          detail: (
            <>
              {r.filing ? <>{FILED_BY[r.filing.by]?.(r.filing)} · </> : null}
              {thread}
            </>
          ),
        },
      }}
    />
  );
}

const clockWords = (offsetMs: number): string =>
  Math.abs(offsetMs) < 1_000
    ? 'right'
    : `${figure(Math.abs(offsetMs) / 1_000, 1)} s ${offsetMs < 0 ? 'slow' : 'fast'}`;

function Facts({ r }: { r: RecordingView }) {
  return (
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
        { term: 'Gain step', value: r.gainStep === null ? null : String(r.gainStep).replace('-', '−') },
        { term: 'Filter', value: r.filter },
        { term: 'Device clock', value: clockWords(r.clockOffsetMs) },
        {
          term: 'Encounter',
          value: r.filing
            ? [r.filing.encounterNumber, r.filing.ward, r.filing.bed].filter(Boolean).join(', ')
            : null,
        },
        { term: 'Moved because', value: r.filing?.reason ?? null },
        {
          term: 'Kept anyway',
          value:
            r.keptAt === null ? null : (
              <>
                {r.keptReason}, <Time at={r.keptAt} mode="minute" className="" />
              </>
            ),
        },
        {
          term: 'Locked until',
          value: r.lockedUntil === null ? null : <Time at={r.lockedUntil} mode="date" className="" />,
        },
        { term: 'SHA-256', value: <code className="break-all text-13">{r.sha256}</code> },
      ]}
    />
  );
}

function Acts({ r, person }: { r: RecordingView; person: Person }) {
  const settled = (r.stage === 'filed' || r.stage === 'measured') && r.stopped === null;
  return (
    <div className="no-print grid justify-items-start">
      {settled && may(person.roles, 'filing.write') ? (
        <MoveFiling number={r.number} version={r.version} from={r.filing ? r.filing.encounterNumber : null} />
      ) : null}
      {settled && r.verdict === 'repeat' && r.keptAt === null && may(person.roles, 'recording.keep') ? (
        <KeepClip number={r.number} />
      ) : null}
      {r.sealedAt ? (
        <a
          className="link inline-flex min-h-11 items-center"
          href={`/api/recordings/${r.number}/original`}
          download
        >
          Download the original
        </a>
      ) : null}
    </div>
  );
}
