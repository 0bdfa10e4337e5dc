import type { Metadata } from 'next';
import Link from 'next/link';
import { notFound } from 'next/navigation';
import { RepeatDelivery } from '@/components/keyroom/RepeatDelivery';
import { WebhookActs } from '@/components/keyroom/WebhookActs';
import { LiveRefresh } from '@/components/shell/LiveEvents';
import { hrefWith } from '@/components/ui/address';
import { Chip, Filters } from '@/components/ui/Chip';
import { DataTable } from '@/components/ui/DataTable';
import { DefinitionList } from '@/components/ui/DefinitionList';
import { EmptyState } from '@/components/ui/EmptyState';
import { PageHead } from '@/components/ui/PageHead';
import { Section } from '@/components/ui/Panel';
import { Time } from '@/components/ui/Time';
import { type ColumnOf, tableOf } from '@/components/ui/tableRows';
import { readSearch } from '@/lib/http/address';
import { requirePage } from '@/lib/http/page';
import { DeliveryFilter, type DeliveryLine, readDeliveries, readWebhook } from '@/lib/webhooks/readWebhooks';

export const metadata: Metadata = { title: 'Webhook' };

const VIEWS = { all: 'All', waiting: 'Waiting', 'set-aside': 'Set aside', delivered: 'Delivered' } as const;

function State({ line }: { line: DeliveryLine }) {
  switch (line.state) {
    case 'delivered':
      return <span className="text-spruce">● delivered</span>;
    case 'held':
      return <span className="text-brass">◐ held back</span>;
    case 'waiting':
      return (
        <>
          ◌ waiting{line.nextTryAt ? ', next try ' : ''}
          {line.nextTryAt ? <Time at={line.nextTryAt} mode="minute" /> : null}
        </>
      );
    default:
      return (
        <span className="font-semibold text-rust">
          ▲ {line.state === 'set-aside' ? 'set aside' : 'not delivered'}
        </span>
      );
  }
}

const COLUMNS: ColumnOf<DeliveryLine>[] = [
  { id: 'at', header: 'Happened', cell: (line) => <Time at={line.createdAt} mode="second" /> },
  { id: 'type', header: 'Event', cell: (line) => <span className="mono">{line.type}</span> },
  { id: 'state', header: 'State', cell: (line) => <State line={line} /> },
  { id: 'tries', header: 'Tries', align: 'right', cell: (line) => line.tries },
  {
    id: 'answer',
    header: 'Last answer',
    wrap: true,
    maxWidth: '36ch',
    cell: (line) =>
      line.state === 'held' ? '' : (line.failure ?? (line.status ? String(line.status) : 'none yet')),
  },
  {
    id: 'acts',
    header: 'Act',
    cell: (line) => (line.state === 'set-aside' ? <RepeatDelivery id={line.id} type={line.type} /> : null),
  },
];

/** One webhook: what it is told, and what came of it. */
export default async function WebhookPage({
  params,
  searchParams,
}: {
  params: Promise<{ id: string }>;
  searchParams: Promise<Record<string, string | string[] | undefined>>;
}) {
  const { person, services } = await requirePage('connections.read');
  const { id } = await params;
  const search = await searchParams;
  const { filter } = readSearch(DeliveryFilter, search);
  const hook = await readWebhook(services, person, id);
  if (!hook) notFound();
  const page = await readDeliveries(services, person, id, filter);
  const link = (changes: Record<string, string | null>) =>
    hrefWith(`/keyroom/webhooks/${id}`, search, { after: null, ...changes });
  const table = tableOf(page.rows, COLUMNS, {
    id: (line) => line.id,
    label: (line) => `${line.type} ${line.eventId}`,
  });
  return (
    <>
      <LiveRefresh subjects={[{ kind: 'webhook', id }]} />
      <PageHead
        title={hook.name}
        back={
          <Link href="/keyroom/webhooks" className="link">
            Webhooks
          </Link>
        }
      >
        {hook.pausedAt === null ? 'Delivers' : 'Held back: what happens is kept for it'};{' '}
        {hook.waiting.toLocaleString('en-GB')} waiting, {hook.setAside.toLocaleString('en-GB')} set aside.
      </PageHead>
      <div className="grid gap-8">
        <DefinitionList
          facts={[
            { term: 'Told at', value: <span className="mono break-all">{hook.url}</span> },
            { term: 'Told when', value: hook.events.join(', ') },
            { term: 'Added', value: <Time at={hook.createdAt} mode="minute" withZone /> },
            { term: 'By', value: hook.createdBy },
            {
              term: 'Secret before',
              value:
                hook.previousEndsAt !== null && hook.previousEndsAt > services.clock.now() ? (
                  <>
                    signs too until <Time at={hook.previousEndsAt} mode="minute" withZone />
                  </>
                ) : null,
            },
          ]}
        />
        <WebhookActs id={id} name={hook.name} paused={hook.pausedAt !== null} version={hook.version} />
        <Section title="Deliveries">
          <Filters>
            {(Object.keys(VIEWS) as (keyof typeof VIEWS)[]).map((view) => (
              <Chip
                key={view}
                href={link({ view: view === 'all' ? null : view })}
                current={filter.view === view}
              >
                {VIEWS[view]}
              </Chip>
            ))}
          </Filters>
          <DataTable
            caption="Deliveries"
            {...table}
            newerHref={filter.after ? link({}) : null}
            olderHref={page.next ? link({ after: page.next }) : null}
            empty={
              <EmptyState title="None of these">
                A delivery stands here for each event that it is told of. Send a test event to see one.
              </EmptyState>
            }
          />
        </Section>
        <Section title="How a receiver checks a delivery">
          <p className="max-w-line">
            The field <span className="mono">webhook-signature</span> holds one or two signatures, each{' '}
            <span className="mono">v1,</span> and base64 of HMAC-SHA-256 under the secret, over{' '}
            <span className="mono">webhook-id</span>, a full stop,{' '}
            <span className="mono">webhook-timestamp</span>, a full stop and the body as it came. One of them
            being right is enough. Refuse a timestamp that is more than five minutes off, and an id that was
            seen before. Answer 2xx within ten seconds; anything else is tried again, up to twelve times.
          </p>
        </Section>
      </div>
    </>
  );
}
