import type { Metadata } from 'next';
import { ChangePasswordForm } from '@/components/identity/ChangePasswordForm';
import { OwnSessions } from '@/components/identity/OwnSessions';
import { Passkeys } from '@/components/identity/Passkeys';
import { roleWords } from '@/components/identity/roleWords';
import { SecondFactor } from '@/components/identity/SecondFactor';
import { DefinitionList } from '@/components/ui/DefinitionList';
import { PageHead } from '@/components/ui/PageHead';
import { Panel, Section } from '@/components/ui/Panel';
import { requirePage } from '@/lib/http/page';
import { hasOwnPassword } from '@/lib/identity/changePassword';
import { listWards } from '@/lib/identity/describePerson';
import { passkeysOf, passkeysPossible } from '@/lib/identity/passkeys/passkeysOf';
import { hasSecondFactor } from '@/lib/identity/secondFactor';
import { sessionsOf } from '@/lib/identity/sessions';

export const metadata: Metadata = { title: 'Account' };

/** One's own account: second factor, sessions, password. */
export default async function AccountPage() {
  const { person, services } = await requirePage('self', { beforeSecondFactor: true });
  const [sessions, on, wards, passkeys, hasPassword] = await Promise.all([
    sessionsOf(services, person.id),
    hasSecondFactor(services, person),
    listWards(services),
    passkeysOf(services, person.id),
    hasOwnPassword(services, person),
  ]);
  const mine = wards.filter((ward) => person.wardIds.includes(ward.id)).map((ward) => ward.name);
  const needed = person.roles.includes('itadmin');
  return (
    <>
      <PageHead title="Account">
        {person.name}, {roleWords(person.roles)}.{' '}
        {on || passkeys.length > 0 ? 'The second factor is on.' : 'There is no second factor.'}
      </PageHead>
      <div className="grid gap-6 plate:grid-cols-[minmax(220px,280px)_minmax(0,1fr)]">
        <DefinitionList
          stacked
          className="self-start"
          facts={[
            { term: 'E-mail', value: person.email },
            { term: 'Work', value: person.jobTitle },
            { term: 'Wards', value: mine.join(', ') || null },
            { term: 'Name, roles and wards', value: 'An IT administrator changes them.' },
          ]}
        />
        <div className="grid content-start gap-6">
          <Panel title="Second factor">
            <SecondFactor on={on} needed={needed && passkeys.length === 0} />
          </Panel>
          {passkeysPossible(services) ? (
            <Panel title="Passkeys">
              <Passkeys passkeys={passkeys} hasPassword={hasPassword} />
            </Panel>
          ) : null}
          <Section title="Sessions">
            <OwnSessions first={{ sessions, current: person.sessionId }} personId={person.id} />
          </Section>
          <Panel title="Password">
            <ChangePasswordForm email={person.email} />
          </Panel>
        </div>
      </div>
    </>
  );
}
