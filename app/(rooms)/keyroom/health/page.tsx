import type { Metadata } from 'next';
import Link from 'next/link';
import { RefreshEvery } from '@/components/keyroom/RefreshEvery';
import { cx } from '@/components/ui/cx';
import { DefinitionList } from '@/components/ui/DefinitionList';
import { PageHead } from '@/components/ui/PageHead';
import { Panel } from '@/components/ui/Panel';
import { Time } from '@/components/ui/Time';
import { readHealth } from '@/lib/health/readHealth';
import type { HealthPart, HealthState } from '@/lib/health/types';
import { requirePage } from '@/lib/http/page';
import { analysisFigures } from '@/lib/http/passage';

export const metadata: Metadata = { title: 'Health' };

const MARKS: Record<HealthState, { words: string; shape: string; colour: string }> = {
  good: { words: 'well', shape: '●', colour: 'text-spruce' },
  care: { words: 'look soon', shape: '◐', colour: 'text-brass' },
  alarm: { words: 'look now', shape: '▲', colour: 'text-rust' },
};

function sentence(parts: readonly HealthPart[]): string {
  const named = (state: HealthState) =>
    parts.filter((part) => part.state === state).map(({ title }) => title);
  const [alarms, cares] = [named('alarm'), named('care')];
  if (alarms.length === 0 && cares.length === 0) return 'All of it is well.';
  return [
    alarms.length > 0 ? `Look now: ${alarms.join(', ')}.` : '',
    cares.length > 0 ? `Look soon: ${cares.join(', ')}.` : '',
  ]
    .filter(Boolean)
    .join(' ');
}

/** How the house is, part by part, each by looking at it now. */
export default async function HealthPage() {
  const { services } = await requirePage('health.read');
  const parts = await readHealth(services, analysisFigures());
  return (
    <>
      <RefreshEvery seconds={15} />
      <PageHead title="Health">{sentence(parts)}</PageHead>
      <div className="grid items-start gap-4 plate:grid-cols-2">
        {parts.map((part) => (
          <Panel
            key={part.id}
            title={part.title}
            aside={
              <span className={cx('font-semibold', MARKS[part.state].colour)}>
                <span aria-hidden="true">{MARKS[part.state].shape}</span> {MARKS[part.state].words}
              </span>
            }
          >
            <p>{part.sentence}</p>
            {part.figures.length > 0 ? (
              <DefinitionList
                className="mt-3"
                facts={part.figures.map(({ term, value, href }) => ({
                  term,
                  value: href ? (
                    <Link href={href} className="link">
                      {value}
                    </Link>
                  ) : (
                    value
                  ),
                }))}
              />
            ) : null}
          </Panel>
        ))}
      </div>
      <p className="mt-4 text-13 text-ink-soft">
        Looked at <Time at={services.clock.now()} mode="second" withZone />, and every 15 seconds while this
        page is open. Supervisors ask <span className="mono">/api/health</span> and{' '}
        <span className="mono">/api/health?deep</span>.
      </p>
    </>
  );
}
