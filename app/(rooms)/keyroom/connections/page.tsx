import type { Metadata } from 'next';
import { type ConnectionField, ConnectionForm } from '@/components/keyroom/ConnectionForm';
import { ConnectionTest } from '@/components/keyroom/ConnectionTest';
import { LiveRefresh } from '@/components/shell/LiveEvents';
import { DefinitionList } from '@/components/ui/DefinitionList';
import { PageHead } from '@/components/ui/PageHead';
import { Panel } from '@/components/ui/Panel';
import { type ConnectionLine, readConnections } from '@/lib/connections/readConnections';
import { requirePage } from '@/lib/http/page';

export const metadata: Metadata = { title: 'Connections' };

interface Words {
  title: string;
  about: string;
  test: string;
  secret: string;
  fields: ConnectionField[];
}

const WORDS: Record<ConnectionLine['kind'], Words> = {
  storage: {
    title: 'Storage',
    about: 'Where originals and their pictures lie.',
    test: 'Put, read and remove an object',
    secret: '',
    fields: [],
  },
  mail: {
    title: 'Mail',
    about: 'Invitations, notices and the auditors’ heads go by it.',
    test: 'Send me a message',
    secret: '',
    fields: [],
  },
  'record-system': {
    title: 'Record system',
    about: 'The hospital’s patients and encounters, by FHIR R4.',
    test: 'Ask for its capabilities and a patient',
    secret: 'Bearer token',
    fields: [
      {
        name: 'baseUrl',
        label: 'FHIR base address',
        type: 'url',
        help: 'Such as https://records.example.org/fhir',
      },
    ],
  },
  'single-sign-on': {
    title: 'Single sign-on',
    about: 'People who are invited here sign in with the hospital’s account, by OpenID Connect.',
    test: 'Ask the provider who it is',
    secret: 'Client secret',
    fields: [
      { name: 'issuer', label: 'Issuer', type: 'url', help: 'As the provider names itself.' },
      { name: 'clientId', label: 'Client id', type: 'text' },
      { name: 'name', label: 'Name on the button', type: 'text', help: 'Such as “the hospital’s account”.' },
      {
        name: 'providerSecondFactor',
        label: 'Believe its second factor',
        type: 'switch',
        help: 'Only where it says that it asked for one. Ours is asked for otherwise.',
      },
    ],
  },
};

/** How the house reaches other systems, each with a test that does the real thing. */
export default async function ConnectionsPage() {
  const { person, services } = await requirePage('connections.read');
  const lines = await readConnections(services, person);
  const set = lines.filter(({ source }) => source !== null);
  const failing = set.filter(({ check }) => check?.ok === false).length;
  const untested = set.filter(({ check }) => check === null).length;
  return (
    <>
      <LiveRefresh subjects={[{ kind: 'connection' }]} />
      <PageHead title="Connections">
        {set.length} of {lines.length} are set up
        {failing > 0 ? `, ${failing} failed the last test` : ''}
        {untested > 0 ? `, ${untested} not tested yet` : ''}.
      </PageHead>
      <div className="grid items-start gap-4 plate:grid-cols-2">
        {lines.map((line) => (
          <Connection key={line.kind} line={line} />
        ))}
      </div>
    </>
  );
}

function Connection({ line }: { line: ConnectionLine }) {
  const words = WORDS[line.kind];
  return (
    <Panel
      title={words.title}
      aside={
        <span className="text-13 text-ink-soft">
          {line.source === null
            ? 'not set up'
            : line.source === 'keyroom'
              ? 'set here'
              : 'set by the environment'}
        </span>
      }
    >
      <div className="grid gap-4">
        <p className="text-ink-soft">{words.about}</p>
        {line.facts.length > 0 ? <DefinitionList facts={line.facts} /> : null}
        {line.source ? <ConnectionTest kind={line.kind} label={words.test} check={line.check} /> : null}
        {line.settable ? (
          <div>
            <ConnectionForm
              key={line.settable.version}
              kind={line.kind}
              title={words.title}
              fields={words.fields}
              secretLabel={words.secret}
              {...line.settable}
            />
          </div>
        ) : null}
      </div>
    </Panel>
  );
}
