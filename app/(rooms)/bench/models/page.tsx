import type { Metadata } from 'next';
import Link from 'next/link';
import { ModelForm } from '@/components/fleet/ModelForm';
import { DataTable } from '@/components/ui/DataTable';
import { EmptyState } from '@/components/ui/EmptyState';
import { PageHead } from '@/components/ui/PageHead';
import { Section } from '@/components/ui/Panel';
import { tableOf } from '@/components/ui/tableRows';
import { readModels } from '@/lib/fleet/readDevice';
import { requirePage } from '@/lib/http/page';
import { may } from '@/lib/identity/permissions';

export const metadata: Metadata = { title: 'Models' };

const rates = (hz: readonly number[]) =>
  hz.length === 0 ? 'any' : hz.map((rate) => `${rate.toLocaleString('en-GB')} Hz`).join(', ');

/** Device models: what their recordings should be. */
export default async function ModelsPage() {
  const { person, services } = await requirePage('model.read');
  const models = await readModels(services, person);
  const table = tableOf(
    models,
    [
      {
        id: 'name',
        header: 'Model',
        cell: ({ model, devices }) => (
          <Link className="link-quiet" href={`/bench?model=${model.id}`}>
            {model.name} <span className="text-ink-soft">({devices})</span>
          </Link>
        ),
      },
      { id: 'rates', header: 'Sample rates', cell: ({ model }) => rates(model.sampleRatesHz) },
      {
        id: 'types',
        header: 'Media types',
        maxWidth: '28ch',
        cell: ({ model }) => model.mediaTypes.join(', '),
      },
      {
        id: 'longest',
        header: 'Longest clip',
        align: 'right',
        cell: ({ model }) => `${model.longestClipSeconds.toLocaleString('en-GB')} s`,
      },
      {
        id: 'check',
        header: 'Check every',
        align: 'right',
        cell: ({ model }) => `${model.checkIntervalDays} days`,
      },
      {
        id: 'signs',
        header: 'Credential',
        cell: ({ model }) =>
          model.signsRequests ? (
            'bound to its key'
          ) : (
            <span className="font-semibold text-brass">◐ bearer only</span>
          ),
      },
    ],
    { id: ({ model }) => model.id, label: ({ model }) => model.name },
  );
  return (
    <>
      <PageHead title="Models" back={<Link href="/bench">Fleet</Link>}>
        What each maker’s model should send. A recording that is otherwise is refused or told so in its
        verdict.
      </PageHead>
      <DataTable
        caption="Device models"
        {...table}
        empty={
          <EmptyState title="No model yet">Describe the first one below; devices are added to it.</EmptyState>
        }
      />
      {may(person.roles, 'model.write') ? (
        <Section title="Describe a model" className="mt-8">
          <ModelForm />
        </Section>
      ) : null}
    </>
  );
}
