import type { Metadata } from 'next';
import Link from 'next/link';
import { SettingsList } from '@/components/keyroom/SettingsList';
import { settingWords } from '@/components/keyroom/settingWords';
import { LiveRefresh } from '@/components/shell/LiveEvents';
import { PageHead } from '@/components/ui/PageHead';
import { Panel } from '@/components/ui/Panel';
import { Time } from '@/components/ui/Time';
import { requirePage } from '@/lib/http/page';
import { readPolicies } from '@/lib/policy/readPolicies';

export const metadata: Metadata = { title: 'Policies' };

/** What the hospital decided, by kind. */
export default async function PoliciesPage() {
  const { person, services } = await requirePage('policy.read');
  const policies = await readPolicies(services, person);
  const decided = policies.filter(({ version }) => version > 0).length;
  return (
    <>
      <LiveRefresh subjects={[{ kind: 'policy' }]} />
      <PageHead title="Policies">
        {decided === 0
          ? 'Nobody decided on a policy yet: the initial values are in force.'
          : `${decided} of ${policies.length} were decided on; the others have their initial values.`}{' '}
        Local law comes first.
      </PageHead>
      <div className="grid gap-4 plate:grid-cols-2">
        {policies.map((policy) => (
          <Panel
            key={policy.kind}
            title={
              <Link href={`/keyroom/policies/${policy.kind}`} className="link">
                {policy.title}
              </Link>
            }
            aside={
              <span className="text-13 text-ink-soft">
                {policy.version === 0 ? (
                  'initial values'
                ) : (
                  <>
                    version {policy.version}, <Time at={policy.changedAt} mode="date" />
                  </>
                )}
              </span>
            }
          >
            <p className="mb-3 text-ink-soft">{policy.about}</p>
            <SettingsList
              rows={Object.entries(policy.fields).map(([name, field]) => ({
                name,
                label: field.label,
                value: settingWords(policy.settings[name], field.type === 'number' ? field.unit : ''),
              }))}
            />
          </Panel>
        ))}
      </div>
    </>
  );
}
