import { statfs } from 'node:fs/promises';
import { dirname, resolve } from 'node:path';
import { and, desc, gte, inArray, isNotNull, isNull, lt, sql } from 'drizzle-orm';
import { custodyEntry, custodyHead, device, outbox, recording } from '@/db/schema';
import { lastBeat, pulseSince } from '@/lib/platform/pulse';
import type { Services } from '@/lib/platform/services';
import { currentPolicy } from '@/lib/policy/currentPolicy';
import { count, type HealthPart } from './types';

export type Needs = Pick<Services, 'read' | 'write' | 'storage' | 'clock' | 'env' | 'mail'>;

const MINUTE_MS = 60_000;
const DAY_MS = 86_400_000;
const GIB = 1024 ** 3;

/** A reading and a write transaction, for real. */
export async function database(services: Needs): Promise<HealthPart> {
  const started = performance.now();
  await services.read.run(sql`select 1`);
  await services.write((tx) => tx.run(sql`select 1`));
  const milliseconds = Math.round(performance.now() - started);
  const [log] = await services.read.select({ n: sql<number>`count(*)` }).from(custodyEntry);
  return {
    id: 'database',
    title: 'Database',
    state: milliseconds > 2000 ? 'care' : 'good',
    sentence: `It reads and writes; both took ${milliseconds} ms.`,
    figures: [
      {
        term: 'Kind',
        value: services.env.DATABASE_URL.startsWith('file:') ? 'a file here' : 'a libSQL server',
      },
      { term: 'Entries in the log', value: (log?.n ?? 0).toLocaleString('en-GB'), href: '/ledger' },
    ],
  };
}

export async function storage(services: Needs): Promise<HealthPart> {
  const started = performance.now();
  await services.storage.head('checks/health');
  const milliseconds = Math.round(performance.now() - started);
  return {
    id: 'storage',
    title: 'Storage',
    state: milliseconds > 3000 ? 'care' : 'good',
    sentence: `It answers; that took ${milliseconds} ms.`,
    figures: [{ term: 'Tested for real on', value: 'Connections', href: '/keyroom/connections' }],
  };
}

/** Work that waits for after a commit: mail, heads, webhooks. */
export async function outboxDepth(services: Needs): Promise<HealthPart> {
  const now = services.clock.now();
  const rows = await services.read
    .select({
      kind: outbox.kind,
      waiting: sql<number>`coalesce(sum(${outbox.doneAt} is null and ${outbox.deadAt} is null), 0)`,
      late: sql<number>`coalesce(sum(${outbox.doneAt} is null and ${outbox.deadAt} is null and ${outbox.createdAt} < ${now - 10 * MINUTE_MS}), 0)`,
      dead: sql<number>`coalesce(sum(${outbox.deadAt} is not null), 0)`,
    })
    .from(outbox)
    .where(isNull(outbox.doneAt))
    .groupBy(outbox.kind);
  const sum = (of: 'waiting' | 'late' | 'dead') => rows.reduce((total, row) => total + row[of], 0);
  const [waiting, late, dead] = [sum('waiting'), sum('late'), sum('dead')];
  return {
    id: 'outbox',
    title: 'Outbox',
    state: dead > 0 ? 'alarm' : late > 0 ? 'care' : 'good',
    sentence: `${count(waiting, 'piece of work waits', 'pieces of work wait')}, ${late.toLocaleString('en-GB')} for more than ten minutes; ${dead.toLocaleString('en-GB')} set aside after the last try.`,
    figures: rows.map((row) => ({
      term: row.kind,
      value: `${row.waiting} waiting, ${row.dead} set aside`,
      ...(row.kind === 'webhook' ? { href: '/keyroom/webhooks' } : {}),
    })),
  };
}

const SWEEP_MISSED_MS = 3 * MINUTE_MS;

export async function sweep(services: Needs): Promise<HealthPart> {
  const now = services.clock.now();
  const [standing] = await services.read
    .select({ n: sql<number>`count(*)` })
    .from(recording)
    .where(
      and(
        inArray(recording.stage, ['received', 'sealed']),
        isNull(recording.stopped),
        lt(recording.awaitedAt, now - 10 * MINUTE_MS),
      ),
    );
  const still = standing?.n ?? 0;
  const last = lastBeat('sweep');
  const missed = now - (last?.at ?? pulseSince()) > SWEEP_MISSED_MS;
  return {
    id: 'sweep',
    title: 'Sweep',
    state: missed || last?.ok === false ? 'alarm' : still > 0 ? 'care' : 'good',
    sentence: `${
      missed
        ? 'It stands still'
        : last === null
          ? 'It was not due yet since the start'
          : last.ok
            ? 'It runs'
            : 'Its last run failed'
    }; ${count(still, 'clip stands', 'clips stand')} half way for more than ten minutes.`,
    figures: [],
  };
}

/** Signed tree heads: how far behind the log the last one is. */
export async function heads(services: Needs): Promise<HealthPart> {
  const now = services.clock.now();
  const [[head], [last]] = await Promise.all([
    services.read.select().from(custodyHead).orderBy(desc(custodyHead.size)).limit(1),
    services.read
      .select({ sequence: custodyEntry.sequence, at: custodyEntry.at })
      .from(custodyEntry)
      .orderBy(desc(custodyEntry.sequence))
      .limit(1),
  ]);
  const behind = (last?.sequence ?? -1) + 1 - (head?.size ?? 0);
  const [oldest] = await services.read
    .select({ at: sql<number | null>`min(${custodyEntry.at})` })
    .from(custodyEntry)
    .where(gte(custodyEntry.sequence, head?.size ?? 0));
  const waits = oldest?.at == null ? 0 : now - oldest.at;
  return {
    id: 'heads',
    title: 'Tree heads',
    state: waits > 15 * MINUTE_MS ? 'alarm' : waits > 5 * MINUTE_MS ? 'care' : 'good',
    sentence:
      behind === 0
        ? 'The last head covers the whole log.'
        : `${count(behind, 'entry is', 'entries are')} newer than the last head.`,
    figures: head ? [{ term: 'Size of the last head', value: head.size.toLocaleString('en-GB') }] : [],
  };
}

export interface PoolFigures {
  size: number;
  busy: number;
  waiting: number;
}

export function pool(stats: PoolFigures | null): HealthPart {
  const waiting = stats?.waiting ?? 0;
  return {
    id: 'pool',
    title: 'Analysis',
    state: waiting > 20 ? 'alarm' : waiting > 4 ? 'care' : 'good',
    sentence: stats
      ? `${stats.busy} of ${count(stats.size, 'thread is', 'threads are')} at work, ${count(waiting, 'clip waits', 'clips wait')}.`
      : 'No clip was analysed by this process yet.',
    figures: [],
  };
}

/** Devices that were heard today and whose clock is far from ours. */
export async function clocks(services: Needs): Promise<HealthPart> {
  const now = services.clock.now();
  const { settings } = await currentPolicy(services.read, 'clock');
  const noticeMs = settings.deviceNoticeSeconds * 1000;
  const recent = and(isNotNull(device.clockOffsetMs), gte(device.lastHeardAt, now - DAY_MS));
  const [[total], worst] = await Promise.all([
    services.read
      .select({
        heard: sql<number>`count(*)`,
        off: sql<number>`coalesce(sum(abs(${device.clockOffsetMs}) >= ${noticeMs}), 0)`,
      })
      .from(device)
      .where(recent),
    services.read
      .select({ id: device.id, assetTag: device.assetTag, offsetMs: device.clockOffsetMs })
      .from(device)
      .where(and(recent, sql`abs(${device.clockOffsetMs}) >= ${noticeMs}`))
      .orderBy(desc(sql`abs(${device.clockOffsetMs})`))
      .limit(5),
  ]);
  const { heard = 0, off = 0 } = total ?? {};
  // One device is off; when most are, it is ours.
  const ours = heard >= 5 && off > heard / 2;
  return {
    id: 'clocks',
    title: 'Clocks',
    state: ours ? 'alarm' : off > 0 ? 'care' : 'good',
    sentence: ours
      ? `${off} of ${heard} devices heard today are off: look at the clock of this server first.`
      : heard === 0
        ? 'No device was heard in the last day.'
        : `${off} of ${count(heard, 'device', 'devices')} heard today ${off === 1 ? 'is' : 'are'} off by ${settings.deviceNoticeSeconds} s or more.`,
    figures: worst.map(({ id, assetTag, offsetMs }) => ({
      term: assetTag,
      value: `${Math.round((offsetMs ?? 0) / 1000).toLocaleString('en-GB')} s`,
      href: `/devices/${id}`,
    })),
  };
}

/** Room where the database lies; null where that is not here. */
export async function disk(services: Needs): Promise<HealthPart | null> {
  const { DATABASE_URL } = services.env;
  if (!DATABASE_URL.startsWith('file:')) return null;
  const folder = dirname(resolve(DATABASE_URL.slice('file:'.length)));
  const { bavail, blocks, bsize } = await statfs(folder);
  const [free, whole] = [bavail * bsize, blocks * bsize];
  const share = whole === 0 ? 1 : free / whole;
  return {
    id: 'disk',
    title: 'Disk',
    state: free < GIB || share < 0.03 ? 'alarm' : free < 5 * GIB || share < 0.1 ? 'care' : 'good',
    sentence: `${(free / GIB).toFixed(1)} GiB are free where the database lies, ${Math.round(share * 100)} %.`,
    figures: [],
  };
}
