import type { Metadata } from 'next';
import Link from 'next/link';
import { notFound } from 'next/navigation';
import { CustodyThread } from '@/components/custody/CustodyThread';
import { PersonActs } from '@/components/identity/PersonActs';
import { PersonRoles } from '@/components/identity/PersonRoles';
import { PersonWards } from '@/components/identity/PersonWards';
import { roleWords } from '@/components/identity/roleWords';
import { SessionsTable } from '@/components/identity/SessionsTable';
import { LiveRefresh } from '@/components/shell/LiveEvents';
import { DefinitionList } from '@/components/ui/DefinitionList';
import { Notice } from '@/components/ui/Notice';
import { PageHead } from '@/components/ui/PageHead';
import { Panel, Section } from '@/components/ui/Panel';
import { Time } from '@/components/ui/Time';
import { readThread } from '@/lib/custody/readThread';
import { requirePage } from '@/lib/http/page';
import { describePerson, listWards, type PersonDescription } from '@/lib/identity/describePerson';

export const metadata: Metadata = { title: 'Person' };

const ENTRIES = 12;

function sentence(found: PersonDescription): string {
  if (found.leftAt !== null) return 'The account is closed. What they did stays under their name.';
  const roles = roleWords(found.roles.map(({ role }) => role));
  const where =
    found.sessions.length === 0
      ? 'not signed in anywhere'
      : found.sessions.length === 1
        ? 'signed in once'
        : `signed in ${found.sessions.length} times`;
  return `${roles || 'No role'}; ${where}.`;
}

const FACTOR = { on: 'on', begun: 'begun, not confirmed', none: 'none' };

/** One person: what they may do, where they are signed in, what happened. */
export default async function PersonPage({ params }: { params: Promise<{ id: string }> }) {
  const { person, services } = await requirePage('people.read');
  const { id } = await params;
  const found = await describePerson(services, person, id);
  if (!found) notFound();
  const [wards, thread] = await Promise.all([
    listWards(services),
    readThread(services, { kind: 'person', id }, { limit: ENTRIES }),
  ]);
  const here = found.leftAt === null;
  const self = id === person.id;
  return (
    <>
      <LiveRefresh subjects={[{ kind: 'person', id }]} />
      <PageHead
        title={found.name}
        back={
          <Link href="/keyroom/people" className="link">
            People
          </Link>
        }
        action={
          here && !self ? (
            <PersonActs
              id={id}
              name={found.name}
              acts={[
                'end-sessions',
                ...(found.secondFactor === 'on' ? (['remove-second-factor'] as const) : []),
                'leave',
              ]}
            />
          ) : null
        }
      >
        {sentence(found)}
      </PageHead>
      {self ? <ThisIsYou /> : null}
      <div className="grid gap-6 plate:grid-cols-[minmax(220px,280px)_minmax(0,1fr)]">
        <Facts found={found} />
        <div className="grid content-start gap-6">
          {here ? <Living found={found} wards={wards} /> : null}
          <Section
            title="What happened"
            aside={
              <Link href={`/ledger/person/${id}`} className="link">
                The whole thread
              </Link>
            }
          >
            <CustodyThread lines={thread.rows} />
          </Section>
        </div>
      </div>
    </>
  );
}

function Facts({ found }: { found: PersonDescription }) {
  return (
    <DefinitionList
      stacked
      className="self-start"
      facts={[
        { term: 'E-mail', value: found.email },
        { term: 'Work', value: found.jobTitle },
        { term: 'Second factor', value: FACTOR[found.secondFactor] },
        { term: 'Passkeys', value: found.passkeys > 0 ? found.passkeys : null },
        { term: 'Joined', value: <Time at={found.joinedAt} mode="date" /> },
        { term: 'Last signed in', value: <Time at={found.lastSignedInAt} mode="minute" withZone /> },
        { term: 'Left', value: found.leftAt === null ? null : <Time at={found.leftAt} mode="minute" /> },
      ]}
    />
  );
}

/** What can be changed about somebody who is here. */
function Living({ found, wards }: { found: PersonDescription; wards: { id: string; name: string }[] }) {
  return (
    <>
      <Panel title="Roles">
        <PersonRoles id={found.id} name={found.name} held={found.roles} />
      </Panel>
      <Panel title="Wards">
        <PersonWards id={found.id} name={found.name} wards={wards} held={found.wardIds} />
      </Panel>
      <Section title="Sessions">
        <SessionsTable sessions={found.sessions} />
      </Section>
    </>
  );
}

function ThisIsYou() {
  return (
    <Notice tone="info" className="mb-6">
      This is you. Sessions, password and second factor are on <Link href="/account">your account page</Link>.
    </Notice>
  );
}
