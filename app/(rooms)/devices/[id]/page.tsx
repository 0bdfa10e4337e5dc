import type { Metadata } from 'next';
import Link from 'next/link';
import { notFound } from 'next/navigation';
import { Sparkline } from '@/components/charts/Sparkline';
import { EntriesTable } from '@/components/custody/EntriesTable';
import { DeviceClips } from '@/components/fleet/DeviceClips';
import { DeviceState, serviceStateWord } from '@/components/fleet/DeviceState';
import { ReportLost } from '@/components/fleet/ReportLost';
import { SentSince } from '@/components/fleet/SentSince';
import { StateChange } from '@/components/fleet/StateChange';
import { LiveRefresh } from '@/components/shell/LiveEvents';
import { ButtonLink } from '@/components/ui/Button';
import { CopyText } from '@/components/ui/CopyText';
import { DefinitionList } from '@/components/ui/DefinitionList';
import { EmptyState } from '@/components/ui/EmptyState';
import { PageHead } from '@/components/ui/PageHead';
import { Section } from '@/components/ui/Panel';
import { Time } from '@/components/ui/Time';
import { readThread } from '@/lib/custody/readThread';
import { mayFollow } from '@/lib/fleet/changeState';
import { type DeviceView, readDevice } from '@/lib/fleet/readDevice';
import { sentSince } from '@/lib/fleet/reportLost';
import { granted, requirePage } from '@/lib/http/page';
import { mayReadThread } from '@/lib/http/threadAccess';
import { may } from '@/lib/identity/permissions';

type Props = {
  params: Promise<{ id: string }>;
  searchParams: Promise<Record<string, string | string[] | undefined>>;
};

export const metadata: Metadata = { title: 'Device' };

const CREDENTIAL_WORDS: Record<string, string> = {
  issued: 'issued, not used yet',
  'in-use': 'in use',
  superseded: 'superseded, still works',
  retired: 'retired',
  revoked: 'revoked',
};

/** One device: what it is, what it sends, what happened. */
export default async function DevicePage({ params, searchParams }: Props) {
  const { person, services } = await requirePage('device.read');
  const view = await readDevice(services, person, decodeURIComponent((await params).id));
  if (!view) notFound();
  const { device } = view;
  const thread = mayReadThread(person, 'device')
    ? await readThread(services, { kind: 'device', id: device.id }, { limit: 12 })
    : null;
  const write = may(person.roles, 'fleet.write');
  const loser = granted(person, 'device.lost');
  const since = Number((await searchParams).since);
  const sent =
    loser && Number.isSafeInteger(since) && since > 0
      ? await sentSince(services, loser, device.id, since)
      : null;
  const clinical = may(person.roles, 'recording.read');
  return (
    <>
      <LiveRefresh subjects={[{ kind: 'device', id: device.id }]} />
      <PageHead
        title={device.assetTag}
        back={may(person.roles, 'fleet.read') ? <Link href="/bench">Fleet</Link> : null}
        action={
          write && device.state !== 'retired' && device.state !== 'lost' ? (
            <ButtonLink
              href={`/devices/${device.id}/sheet`}
              variant={device.state === 'waiting' ? 'primary' : 'plain'}
            >
              {device.state === 'waiting' ? 'Make an enrolment sheet' : 'Enrol again…'}
            </ButtonLink>
          ) : null
        }
      >
        {view.model.name}, {view.ward ?? 'no ward'}.{' '}
        {device.state === 'waiting' ? (
          'It waits for its enrolment'
        ) : (
          <>It is {serviceStateWord(device.state).toLowerCase()}</>
        )}
        {device.stateReason ? <>: {device.stateReason}</> : null}.{' '}
        {device.lastHeardAt === null ? (
          'It was never heard.'
        ) : (
          <>
            Last heard <Time at={device.lastHeardAt} ago />.
          </>
        )}
      </PageHead>
      <div className="grid gap-x-8 gap-y-8 plate:grid-cols-[300px_minmax(0,1fr)]">
        <aside className="grid content-start gap-7">
          <Identity view={view} />
          <CredentialFacts view={view} />
          {write ? (
            <Section title="Service life">
              <p className="mb-2">
                <DeviceState state={device.state} />
              </p>
              <StateChange
                deviceId={device.id}
                assetTag={device.assetTag}
                version={device.version}
                next={mayFollow(device.state)}
              />
            </Section>
          ) : null}
          {loser && !['lost', 'retired', 'waiting'].includes(device.state) ? (
            <Section title="Not to be found">
              <ReportLost deviceId={device.id} assetTag={device.assetTag} version={device.version} />
            </Section>
          ) : null}
        </aside>
        <div className="grid min-w-0 content-start gap-8">
          {sent ? <SentSince sinceMs={since} clips={sent} /> : null}
          <Section title="Noise floor of its own clips, daily median, 60 days">
            {view.noiseFloor.length === 0 ? (
              <p className="text-ink-soft">No clips yet.</p>
            ) : (
              <Floors view={view} />
            )}
          </Section>
          <Section title="Latest recordings">
            <DeviceClips clips={view.clips} linked={clinical} />
          </Section>
          {thread ? (
            <Section
              title="What happened"
              aside={
                <Link className="link" href={`/ledger/device/${device.id}`}>
                  All entries
                </Link>
              }
            >
              <EntriesTable
                rows={thread.rows}
                olderHref={null}
                newerHref={null}
                empty={<EmptyState title="Nothing yet" />}
              />
            </Section>
          ) : null}
        </div>
      </div>
    </>
  );
}

function Identity({ view: { device, model, ward, firmwareChanges } }: { view: DeviceView }) {
  return (
    <Section title="Identity">
      <DefinitionList
        facts={[
          { term: 'Serial', value: <CopyText text={device.serialNumber} what="serial number" /> },
          {
            term: 'UDI',
            value: device.udi ? <code className="break-all">{device.udi}</code> : 'not recorded',
          },
          { term: 'Lot', value: device.lot },
          { term: 'Model', value: model.name },
          { term: 'Maker', value: model.maker },
          { term: 'Ward', value: ward ?? 'none' },
          { term: 'Firmware', value: <span className="mono">{device.firmware ?? 'not known'}</span> },
          {
            term: 'Changed',
            value:
              firmwareChanges.length > 0 ? (
                <ul>
                  {firmwareChanges.map((change) => (
                    <li key={change.id}>
                      <span className="mono">
                        {change.from ?? '?'} → {change.to}
                      </span>
                      , <Time at={change.at} mode="date" />
                    </li>
                  ))}
                </ul>
              ) : null,
          },
          { term: 'Battery', value: device.batteryPercent === null ? null : `${device.batteryPercent} %` },
          {
            term: 'Clock',
            value:
              device.clockOffsetMs === null
                ? null
                : Math.abs(device.clockOffsetMs) < 2000
                  ? 'right'
                  : `${Math.round(Math.abs(device.clockOffsetMs) / 1000).toLocaleString('en-GB')} s ${device.clockOffsetMs < 0 ? 'slow' : 'fast'}`,
          },
          { term: 'Checked', value: <Time at={device.lastCheckAt} mode="date" never="not yet" /> },
          {
            term: 'Check due',
            value: <Time at={device.checkDueAt} mode="date" never="after its first check" />,
          },
        ]}
      />
    </Section>
  );
}

function CredentialFacts({ view: { device, model, credentials, openCode } }: { view: DeviceView }) {
  return (
    <Section title="Credential">
      <DefinitionList
        facts={[
          {
            term: 'Key',
            value: device.keyThumbprint ? (
              <CopyText
                text={device.keyThumbprint}
                what="key thumbprint"
                shown={`${device.keyThumbprint.slice(0, 6)}…${device.keyThumbprint.slice(-4)}`}
              />
            ) : (
              'none yet'
            ),
          },
          { term: 'Enrolled', value: <Time at={device.enrolledAt} mode="minute" never="not yet" /> },
          {
            term: 'Binding',
            value: model.signsRequests ? (
              'bound to its key'
            ) : (
              <span className="font-semibold text-brass">◐ bearer only</span>
            ),
          },
          {
            term: 'Open code',
            value: openCode ? (
              <>
                until <Time at={openCode.expiresAt} mode="minute" />, {openCode.triesLeft} tries left
              </>
            ) : null,
          },
        ]}
      />
      {credentials.length > 0 ? (
        <ul className="mt-3 grid gap-1 text-13">
          {credentials.slice(0, 5).map((one) => (
            <li key={one.id}>
              <span className="mono">{one.label}</span> {CREDENTIAL_WORDS[one.state] ?? one.state}, ends{' '}
              <Time at={one.expiresAt} mode="date" />
            </li>
          ))}
        </ul>
      ) : null}
    </Section>
  );
}

function Floors({ view: { device, noiseFloor } }: { view: DeviceView }) {
  const values = noiseFloor.map((day) => day.dbfs);
  const last = values.at(-1) ?? 0;
  return (
    <div className="grid gap-2">
      {values.length < 2 ? null : (
        <div className="relative max-w-full overflow-x-auto">
          <Sparkline
            values={values}
            label={`Noise floor of ${device.assetTag} over 60 days`}
            unit="dBFS"
            limit={-50}
            alarm={last > -50}
            width={640}
            height={96}
          />
        </div>
      )}
      <p className="text-13 text-ink-soft">
        Latest {last.toFixed(1).replace('-', '−')} dBFS; the dotted line is −50 dBFS. A rise means “send to
        the bench”, not “broken”.
      </p>
    </div>
  );
}
