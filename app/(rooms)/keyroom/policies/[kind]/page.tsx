import type { Metadata } from 'next';
import Link from 'next/link';
import { notFound } from 'next/navigation';
import { PolicyForm } from '@/components/keyroom/PolicyForm';
import { SettingsList } from '@/components/keyroom/SettingsList';
import { settingWords } from '@/components/keyroom/settingWords';
import { DataTable } from '@/components/ui/DataTable';
import { EmptyState } from '@/components/ui/EmptyState';
import { PageHead } from '@/components/ui/PageHead';
import { Panel, Section } from '@/components/ui/Panel';
import { Time } from '@/components/ui/Time';
import { type ColumnOf, tableOf } from '@/components/ui/tableRows';
import { requirePage } from '@/lib/http/page';
import { may } from '@/lib/identity/permissions';
import { type PolicyVersionLine, readPolicy } from '@/lib/policy/readPolicies';

export const metadata: Metadata = { title: 'Policy' };

const COLUMNS: ColumnOf<PolicyVersionLine>[] = [
  { id: 'version', header: 'Version', align: 'right', cell: (line) => line.version },
  { id: 'at', header: 'In force from', cell: (line) => <Time at={line.madeAt} mode="minute" withZone /> },
  { id: 'by', header: 'By', maxWidth: '22ch', cell: (line) => line.madeBy },
  {
    id: 'changes',
    header: 'Change',
    wrap: true,
    cell: (line) => (
      <ul>
        {line.changes.map(({ label, unit, before, after }) => (
          <li key={label}>
            {label}: {settingWords(before, unit)} to {settingWords(after, unit)}
          </li>
        ))}
      </ul>
    ),
  },
  { id: 'reason', header: 'Reason', wrap: true, maxWidth: '40ch', cell: (line) => line.reason },
];

/** One policy: what is in force, a change with its preview, and every version before. */
export default async function PolicyPage({
  params,
  searchParams,
}: {
  params: Promise<{ kind: string }>;
  searchParams: Promise<Record<string, string | string[] | undefined>>;
}) {
  const { person, services } = await requirePage('policy.read');
  const { kind } = await params;
  const before = Number([(await searchParams).before].flat()[0]);
  const policy = await readPolicy(services, person, kind, before > 0 ? before : undefined);
  if (!policy) notFound();
  const fields = Object.entries(policy.fields).map(([name, field]) => ({ name, ...field }));
  const table = tableOf(policy.history, COLUMNS, {
    id: (line) => String(line.version),
    label: (line) => `version ${line.version}`,
  });
  const here = `/keyroom/policies/${kind}`;
  return (
    <>
      <PageHead
        title={policy.title}
        back={
          <Link href="/keyroom/policies" className="link">
            Policies
          </Link>
        }
      >
        {policy.about}{' '}
        {policy.version === 0 ? 'The initial values are in force.' : `Version ${policy.version} is in force.`}
      </PageHead>
      <div className="grid gap-8">
        <Panel title={may(person.roles, 'policy.write') ? 'Change it' : 'In force'}>
          {may(person.roles, 'policy.write') ? (
            <PolicyForm
              key={policy.version}
              kind={kind}
              title={policy.title}
              version={policy.version}
              fields={fields}
              settings={policy.settings}
            />
          ) : (
            <SettingsList
              rows={fields.map((field) => ({
                name: field.name,
                label: field.label,
                value: settingWords(policy.settings[field.name], field.type === 'number' ? field.unit : ''),
              }))}
            />
          )}
        </Panel>
        <Section title="Versions">
          <DataTable
            caption="Versions of this policy"
            {...table}
            newerHref={before > 0 ? here : null}
            olderHref={policy.next === null ? null : `${here}?before=${policy.next}`}
            empty={
              <EmptyState title="No version yet">
                The initial values are in force until somebody decides.
              </EmptyState>
            }
          />
        </Section>
      </div>
    </>
  );
}
