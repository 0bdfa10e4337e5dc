import { and, asc, desc, eq, gt, inArray, lt, or, sql } from 'drizzle-orm';
import { z } from 'zod';
import { credential, device, MEMBER_STATES, rotationMember, rotationRun, user, ward } from '@/db/schema';
import type { Authorized } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';

const PAGE = 50;
type Counts = Record<(typeof MEMBER_STATES)[number], number>;

export const RunFilter = z.strictObject({
  /** Keyset: `startedAt id` of the last row of the page before. */
  after: z
    .string()
    .regex(/^\d+ [\w-]+$/)
    .optional(),
});
export type RunFilter = z.infer<typeof RunFilter>;

export interface RunLine {
  id: string;
  label: string;
  state: (typeof rotationRun.$inferSelect)['state'];
  reason: string;
  startedBy: string;
  startedAt: number;
  deadlineAt: number;
  endedAt: number | null;
  atDeadline: 'keep' | 'revoke';
  waveSize: number;
  wavePauseMs: number;
  version: number;
  counts: Counts;
}

async function countsOf(services: Pick<Services, 'read'>, runIds: string[]): Promise<Map<string, Counts>> {
  const none = () => Object.fromEntries(MEMBER_STATES.map((state) => [state, 0])) as Counts;
  const all = new Map(runIds.map((id) => [id, none()]));
  if (runIds.length === 0) return all;
  const rows = await services.read
    .select({ runId: rotationMember.runId, state: rotationMember.state, count: sql<number>`count(*)` })
    .from(rotationMember)
    .where(inArray(rotationMember.runId, runIds))
    .groupBy(rotationMember.runId, rotationMember.state);
  for (const { runId, state, count } of rows) {
    const counts = all.get(runId);
    if (counts) counts[state] = count;
  }
  return all;
}

const line = (
  run: typeof rotationRun.$inferSelect,
  startedBy: string | null,
  counts: Counts | undefined,
): RunLine => ({
  id: run.id,
  label: run.label,
  state: run.state,
  reason: run.reason,
  startedBy: startedBy ?? 'somebody who left',
  startedAt: run.startedAt,
  deadlineAt: run.deadlineAt,
  endedAt: run.endedAt,
  atDeadline: run.atDeadline,
  waveSize: run.waveSize,
  wavePauseMs: run.wavePauseMs,
  version: run.version,
  counts: counts as Counts,
});

/** Rotation runs, the youngest first, a page at a time. */
export async function readRuns(
  services: Pick<Services, 'read'>,
  _by: Authorized<'credential.read'>,
  { after }: RunFilter,
): Promise<{ rows: RunLine[]; next: string | null }> {
  const [at, id] = after?.split(' ') ?? [];
  const rows = await services.read
    .select({ run: rotationRun, by: user.name })
    .from(rotationRun)
    .leftJoin(user, eq(user.id, rotationRun.startedBy))
    .where(
      at === undefined
        ? undefined
        : or(
            lt(rotationRun.startedAt, Number(at)),
            and(eq(rotationRun.startedAt, Number(at)), lt(rotationRun.id, id ?? '')),
          ),
    )
    .orderBy(desc(rotationRun.startedAt), desc(rotationRun.id))
    .limit(PAGE + 1);
  const shown = rows.slice(0, PAGE);
  const counts = await countsOf(
    services,
    shown.map(({ run }) => run.id),
  );
  const last = shown.at(-1)?.run;
  return {
    rows: shown.map(({ run, by }) => line(run, by, counts.get(run.id))),
    next: rows.length > PAGE && last ? `${last.startedAt} ${last.id}` : null,
  };
}

export const MemberFilter = z.strictObject({
  view: z.enum(['stragglers', 'done', 'missed', 'left-out']).default('stragglers'),
  /** Keyset: asset tag of the last row of the page before. */
  after: z.string().max(100).optional(),
});
export type MemberFilter = z.infer<typeof MemberFilter>;

export interface MemberLine {
  credentialId: string;
  label: string;
  deviceId: string;
  assetTag: string;
  ward: string | null;
  state: (typeof MEMBER_STATES)[number];
  /** It holds its successor, and has not used it yet. */
  renewed: boolean;
  askedAt: number | null;
  endedAt: number | null;
  lastHeardAt: number | null;
}

const STATES_OF = {
  stragglers: ['waiting', 'asked'],
  done: ['done'],
  missed: ['missed'],
  'left-out': ['left-out'],
} as const;

/**
 * One run with its members by name and ward; those that are not done first.
 *
 * @throws Refusal `not-found`
 */
export async function readRun(
  services: Pick<Services, 'read'>,
  _by: Authorized<'credential.read'>,
  id: string,
  { view, after }: MemberFilter,
): Promise<{ run: RunLine; rows: MemberLine[]; next: string | null }> {
  const [found] = await services.read
    .select({ run: rotationRun, by: user.name })
    .from(rotationRun)
    .leftJoin(user, eq(user.id, rotationRun.startedBy))
    .where(eq(rotationRun.id, id))
    .limit(1);
  if (!found) throw new Refusal('not-found');
  const rows = await services.read
    .select({
      credentialId: rotationMember.credentialId,
      label: credential.label,
      deviceId: device.id,
      assetTag: device.assetTag,
      ward: ward.name,
      state: rotationMember.state,
      successorId: credential.successorId,
      askedAt: rotationMember.askedAt,
      endedAt: rotationMember.endedAt,
      lastHeardAt: device.lastHeardAt,
    })
    .from(rotationMember)
    .innerJoin(credential, eq(credential.id, rotationMember.credentialId))
    .innerJoin(device, eq(device.id, rotationMember.deviceId))
    .leftJoin(ward, eq(ward.id, device.wardId))
    .where(
      and(
        eq(rotationMember.runId, id),
        inArray(rotationMember.state, [...STATES_OF[view]]),
        after === undefined ? undefined : gt(device.assetTag, after),
      ),
    )
    .orderBy(asc(device.assetTag))
    .limit(PAGE + 1);
  const counts = await countsOf(services, [id]);
  const shown = rows.slice(0, PAGE);
  return {
    run: line(found.run, found.by, counts.get(id)),
    rows: shown.map(({ successorId, ...row }) => ({ ...row, renewed: successorId !== null })),
    next: rows.length > PAGE ? (shown.at(-1)?.assetTag ?? null) : null,
  };
}
