'use client';

import Link from 'next/link';
import { Sparkline } from '@/components/charts/Sparkline';
import { PassageStrip, type Stage } from '@/components/custody/PassageStrip';
import { concerns } from '@/components/shell/LiveEvents';
import { useData } from '@/components/shell/useData';
import { useClock } from '@/components/ui/Clock';
import { DataTable } from '@/components/ui/DataTable';
import { EmptyState } from '@/components/ui/EmptyState';
import { Time } from '@/components/ui/Time';
import { type ColumnOf, tableOf } from '@/components/ui/tableRows';
import { DeviceState } from './DeviceState';
import { FleetActions } from './FleetActions';

export interface FleetLine {
  id: string;
  version: number;
  assetTag: string;
  serialNumber: string;
  udi: string | null;
  model: string;
  ward: string | null;
  firmware: string | null;
  state: 'waiting' | 'in-service' | 'quarantined' | 'in-repair' | 'lost' | 'retired';
  stateReason: string | null;
  lastHeardAt: number | null;
  batteryPercent: number | null;
  checkDueAt: number | null;
  credentialEndsAt: number | null;
  bearerOnly: boolean;
  latest: {
    number: string;
    stage: string;
    stopped: string | null;
    verdict: string | null;
    at: number;
  } | null;
  noiseFloor: { day: number; dbfs: number }[];
}
export interface FleetAnswer {
  rows: FleetLine[];
  next: string | null;
  total: number;
}

const DAY_MS = 86_400_000;
/** Where a floor is worth a look: the dotted line of the small charts. */
const FLOOR_LIMIT_DBFS = -50;

function Due({ at, days }: { at: number | null; days: number }) {
  const { now } = useClock();
  if (at === null) return <span className="text-ink-soft">none yet</span>;
  const left = now === undefined ? Number.POSITIVE_INFINITY : at - now;
  const tone =
    left < 0 ? 'font-semibold text-rust' : left < days * DAY_MS ? 'font-semibold text-brass' : undefined;
  return <Time at={at} mode="date" {...(tone ? { className: tone } : {})} />;
}

function Heard({ line }: { line: FleetLine }) {
  const { now } = useClock();
  const quiet =
    line.state === 'in-service' &&
    line.lastHeardAt !== null &&
    now !== undefined &&
    now - line.lastHeardAt > 4 * DAY_MS;
  return <Time at={line.lastHeardAt} {...(quiet ? { className: 'font-semibold text-rust' } : {})} />;
}

function Floor({ line }: { line: FleetLine }) {
  const last = line.noiseFloor.at(-1);
  if (!last) return <span className="text-ink-soft">no clips yet</span>;
  return (
    <span className="flex items-center gap-2.5">
      <Sparkline
        values={line.noiseFloor.map((day) => day.dbfs)}
        label={`Noise floor of ${line.assetTag} over 60 days`}
        unit="dBFS"
        limit={FLOOR_LIMIT_DBFS}
        alarm={last.dbfs > FLOOR_LIMIT_DBFS}
      />
      <span>{last.dbfs.toFixed(1).replace('-', '−')}</span>
    </span>
  );
}

const COLUMNS: ColumnOf<FleetLine>[] = [
  {
    id: 'assetTag',
    header: 'Asset tag',
    sortKey: 'assetTag',
    fixed: true,
    cell: (d) => (
      <Link className="link-quiet mono" href={`/devices/${d.id}`}>
        {d.assetTag}
      </Link>
    ),
  },
  { id: 'model', header: 'Model', maxWidth: '16ch', cell: (d) => d.model },
  { id: 'serial', header: 'Serial', cell: (d) => <span className="mono">{d.serialNumber}</span> },
  { id: 'ward', header: 'Ward', maxWidth: '11ch', cell: (d) => d.ward ?? 'none' },
  {
    id: 'state',
    header: 'State',
    cell: (d) => <DeviceState state={d.state} />,
    title: (d) => d.stateReason ?? undefined,
  },
  { id: 'heard', header: 'Last heard', sortKey: 'lastHeard', cell: (d) => <Heard line={d} /> },
  {
    id: 'latest',
    header: 'Latest clip',
    cell: (d) => (
      <PassageStrip
        stage={(d.latest?.stage as Stage | undefined) ?? null}
        stopped={d.latest?.stopped != null}
        verdict={(d.latest?.verdict as 'usable' | null | undefined) ?? null}
      />
    ),
  },
  { id: 'floor', header: 'Noise floor, dBFS', cell: (d) => <Floor line={d} /> },
  {
    id: 'due',
    header: 'Check due',
    sortKey: 'checkDue',
    cell: (d) =>
      d.state === 'waiting' ? (
        <span className="text-ink-soft">after enrolment</span>
      ) : (
        <Due at={d.checkDueAt} days={7} />
      ),
  },
  {
    id: 'credential',
    header: 'Credential ends',
    cell: (d) => (
      <span className="inline-flex items-center gap-2">
        <Due at={d.credentialEndsAt} days={7} />
        {d.bearerOnly && d.credentialEndsAt !== null ? (
          <span className="text-13 font-semibold text-brass">◐ bearer</span>
        ) : null}
      </span>
    ),
  },
  {
    id: 'firmware',
    header: 'Firmware',
    hidden: true,
    cell: (d) => <span className="mono">{d.firmware ?? ''}</span>,
  },
  {
    id: 'battery',
    header: 'Battery',
    hidden: true,
    align: 'right',
    cell: (d) => (d.batteryPercent === null ? '' : `${d.batteryPercent} %`),
  },
  { id: 'udi', header: 'UDI', hidden: true, maxWidth: '24ch', cell: (d) => d.udi ?? '' },
];

/** The fleet. Rows follow what the devices do, without a reload. */
export function FleetTable({
  href,
  first,
  olderHref,
  newerHref,
  csvHref,
  mayWrite,
  filtered,
}: {
  href: string;
  first: FleetAnswer;
  olderHref: string | null;
  newerHref: string | null;
  csvHref: string;
  mayWrite: boolean;
  filtered: boolean;
}) {
  const { data, error, mutate } = useData<FleetAnswer>(href, first, (event) => concerns(event, 'device'));
  const rows = data?.rows ?? [];
  const table = tableOf(rows, COLUMNS, {
    id: (d) => d.id,
    label: (d) => d.assetTag,
    href: (d) => `/devices/${d.id}`,
  });
  return (
    <DataTable
      caption="Devices"
      tableId="fleet"
      noun={['device', 'devices']}
      {...table}
      {...(mayWrite ? { actions: <FleetActions lines={rows} onDone={() => void mutate()} /> } : {})}
      error={error && !data ? { message: error.message, onRetry: () => void mutate() } : null}
      range={
        rows.length === 0
          ? null
          : `${rows.length.toLocaleString('en-GB')} of ${(data?.total ?? 0).toLocaleString('en-GB')}`
      }
      olderHref={olderHref}
      newerHref={newerHref}
      foot={
        <a className="link" href={csvHref} download>
          Export CSV
        </a>
      }
      empty={
        <EmptyState title={filtered ? 'No device matches' : 'No devices yet'}>
          {filtered
            ? 'Take a filter away.'
            : 'Add the first one: you get a sheet with a code by which the device enrols itself.'}
        </EmptyState>
      }
    />
  );
}
