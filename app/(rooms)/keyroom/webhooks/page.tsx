import type { Metadata } from 'next';
import Link from 'next/link';
import { AddWebhookButton } from '@/components/keyroom/AddWebhookButton';
import { LiveRefresh } from '@/components/shell/LiveEvents';
import { DataTable } from '@/components/ui/DataTable';
import { EmptyState } from '@/components/ui/EmptyState';
import { PageHead } from '@/components/ui/PageHead';
import { Time } from '@/components/ui/Time';
import { type ColumnOf, tableOf } from '@/components/ui/tableRows';
import { requirePage } from '@/lib/http/page';
import { readWebhooks, type WebhookLine } from '@/lib/webhooks/readWebhooks';

export const metadata: Metadata = { title: 'Webhooks' };

const COLUMNS: ColumnOf<WebhookLine>[] = [
  {
    id: 'name',
    header: 'Webhook',
    maxWidth: '28ch',
    cell: (hook) => (
      <Link href={`/keyroom/webhooks/${hook.id}`} className="link">
        {hook.name}
      </Link>
    ),
  },
  {
    id: 'host',
    header: 'Told at',
    maxWidth: '30ch',
    cell: (hook) => <span className="mono">{new URL(hook.url).host}</span>,
    title: (hook) => hook.url,
  },
  { id: 'events', header: 'Events', align: 'right', cell: (hook) => hook.events.length },
  {
    id: 'state',
    header: 'State',
    cell: (hook) =>
      hook.pausedAt !== null ? (
        <span className="font-semibold text-brass">◐ held back</span>
      ) : hook.setAside > 0 ? (
        <span className="font-semibold text-rust">▲ {hook.setAside} set aside</span>
      ) : (
        'delivers'
      ),
  },
  { id: 'waiting', header: 'Waiting', align: 'right', cell: (hook) => hook.waiting },
  {
    id: 'last',
    header: 'Last delivered',
    cell: (hook) => <Time at={hook.lastDeliveredAt} never="not yet" />,
  },
];

/** Other systems that are told what happens. */
export default async function WebhooksPage() {
  const { person, services } = await requirePage('connections.read');
  const hooks = await readWebhooks(services, person);
  const aside = hooks.reduce((sum, hook) => sum + hook.setAside, 0);
  const table = tableOf(hooks, COLUMNS, {
    id: (hook) => hook.id,
    label: (hook) => hook.name,
    href: (hook) => `/keyroom/webhooks/${hook.id}`,
  });
  return (
    <>
      <LiveRefresh subjects={[{ kind: 'webhook' }]} />
      <PageHead title="Webhooks" action={<AddWebhookButton />}>
        {hooks.length === 0
          ? 'No other system is told what happens.'
          : `${hooks.length} ${hooks.length === 1 ? 'address is' : 'addresses are'} told what happens; ${aside === 0 ? 'nothing was set aside' : `${aside} ${aside === 1 ? 'delivery was' : 'deliveries were'} set aside`}.`}
      </PageHead>
      <DataTable
        caption="Webhooks"
        {...table}
        empty={
          <EmptyState title="No webhooks yet">
            Add one with the button above: it is told what happens from then on, signed, without patients.
          </EmptyState>
        }
      />
    </>
  );
}
