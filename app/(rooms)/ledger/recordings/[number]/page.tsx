import type { Metadata } from 'next';
import Link from 'next/link';
import { notFound } from 'next/navigation';
import { CustodyThread } from '@/components/custody/CustodyThread';
import { EvidencePanel, MakeEvidence } from '@/components/custody/EvidencePanel';
import { wordedEntry } from '@/components/custody/entryWords';
import { VerifyThread } from '@/components/custody/VerifyThread';
import { LiveRefresh } from '@/components/shell/LiveEvents';
import { ButtonLink } from '@/components/ui/Button';
import { DefinitionList } from '@/components/ui/DefinitionList';
import { PageHead } from '@/components/ui/PageHead';
import { Pager } from '@/components/ui/Pager';
import { Section } from '@/components/ui/Panel';
import { Time } from '@/components/ui/Time';
import { listEvidence } from '@/lib/custody/evidence/listEvidence';
import { readThread, threadExtent } from '@/lib/custody/readThread';
import { requirePage } from '@/lib/http/page';
import { recordingForThread } from '@/lib/http/threadAccess';
import { may } from '@/lib/identity/permissions';

type Props = { params: Promise<{ number: string }>; searchParams: Promise<{ before?: string | string[] }> };

export async function generateMetadata({ params }: Props): Promise<Metadata> {
  return { title: `Custody of ${(await params).number}` };
}

/** The custody thread of one recording: beads on a tube, and the check in the reader's browser. */
export default async function ThreadPage({ params, searchParams }: Props) {
  const { person, services } = await requirePage('thread.read');
  const recording = await recordingForThread(services, person, (await params).number);
  if (!recording) notFound();
  const subject = { kind: 'recording' as const, id: recording.id };
  const before = Number((await searchParams).before) || undefined;
  const mayExport = may(person.roles, 'evidence.make');
  const [page, extent, requests] = await Promise.all([
    readThread(services, subject, { before }),
    threadExtent(services, subject),
    mayExport ? listEvidence(services, recording.id) : [],
  ]);
  const alarms = page.rows.filter((row) => wordedEntry(row.entry).tone === 'alarm');
  const path = `/ledger/recordings/${recording.number}`;
  return (
    <>
      <LiveRefresh subjects={[subject]} />
      <PageHead
        title={`Custody of ${recording.number}`}
        action={
          <>
            {may(person.roles, 'recording.read') ? (
              <ButtonLink href={`/recordings/${recording.number}`}>Open the recording</ButtonLink>
            ) : null}
            {mayExport ? (
              <MakeEvidence number={recording.number} sealed={recording.sealedAt !== null} />
            ) : null}
          </>
        }
      >
        {extent.count.toLocaleString('en-GB')} {extent.count === 1 ? 'entry' : 'entries'} since{' '}
        <Time at={extent.first} mode="second" withZone />.{' '}
        {alarms.length > 0 ? (
          <>
            <Link href={`#entry-${alarms[0]?.sequence}`}>
              {alarms.length === 1 ? 'One needs' : `${alarms.length} need`} a look
            </Link>
            : {alarms.map((row) => wordedEntry(row.entry).title.toLowerCase()).join(', ')}.
          </>
        ) : (
          'Nothing in it stands out.'
        )}
      </PageHead>
      <div className="grid gap-x-10 gap-y-8 plate:grid-cols-[minmax(0,1fr)_minmax(300px,470px)]">
        <div>
          <CustodyThread lines={page.rows} />
          {page.next !== null || before !== undefined ? (
            <Pager
              olderHref={page.next === null ? null : `${path}?before=${page.next}`}
              newerHref={before === undefined ? null : path}
            />
          ) : null}
        </div>
        <aside className="grid content-start gap-6">
          <VerifyThread
            number={recording.number}
            mayOpen={may(person.roles, 'recording.read') && recording.sealedAt !== null}
            thread={{
              sha256: recording.declaredSha256,
              entries: page.rows.map(({ sequence, canonical, leafHash }) => ({
                sequence,
                canonical,
                leafHash,
              })),
            }}
          />
          {requests.length > 0 ? <EvidencePanel requests={requests} personId={person.id} /> : null}
          <Section title="The original">
            <DefinitionList
              facts={[
                { term: 'SHA-256', value: <code className="break-all">{recording.declaredSha256}</code> },
                { term: 'Bytes', value: recording.declaredBytes.toLocaleString('en-GB') },
                {
                  term: 'Device',
                  value: (
                    <Link className="link font-mono" href={`/devices/${recording.deviceId}`}>
                      {recording.assetTag}
                    </Link>
                  ),
                },
                {
                  term: 'Sealed',
                  value: <Time at={recording.sealedAt} mode="second" withZone never="not yet" />,
                },
                {
                  term: 'Locked until',
                  value:
                    recording.lockedUntil === null ? (
                      'the store has no lock'
                    ) : (
                      <Time at={recording.lockedUntil} mode="date" />
                    ),
                },
              ]}
            />
          </Section>
        </aside>
      </div>
    </>
  );
}
