import { and, asc, eq, gt, inArray, isNotNull, isNull, lte, or, type SQL, sql } from 'drizzle-orm';
import { z } from 'zod';
import { credential, device, deviceModel, ward } from '@/db/schema';
import type { Authorized } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';

export const CredentialFilter = z.strictObject({
  view: z.enum(['living', 'ending', 'bearer', 'asked', 'superseded', 'ended']).default('living'),
  q: z.string().trim().max(100).default(''),
  /** Keyset: `expiresAt id` of the last row of the page before. */
  after: z
    .string()
    .regex(/^\d+ [\w-]+$/)
    .optional(),
  limit: z.coerce.number().int().min(1).max(200).default(50),
});
export type CredentialFilter = z.infer<typeof CredentialFilter>;

const DAY_MS = 86_400_000;
/** "Ending" means within this. */
export const ENDING_WITHIN_MS = 14 * DAY_MS;
const LIVING = ['issued', 'in-use', 'superseded'] as const;

function viewOf(view: CredentialFilter['view'], now: number): SQL | undefined {
  const living = and(inArray(credential.state, [...LIVING]), gt(credential.expiresAt, now));
  const last = isNull(credential.successorId);
  switch (view) {
    case 'living':
      return living;
    case 'ending':
      return and(living, last, lte(credential.expiresAt, now + ENDING_WITHIN_MS));
    case 'bearer':
      return and(living, isNull(credential.boundThumbprint));
    case 'asked':
      return and(living, last, isNotNull(credential.renewalAskedAt));
    case 'superseded':
      return and(living, eq(credential.state, 'superseded'));
    case 'ended':
      return or(inArray(credential.state, ['retired', 'revoked']), lte(credential.expiresAt, now));
  }
}

export interface CredentialLine {
  id: string;
  label: string;
  deviceId: string;
  assetTag: string;
  model: string;
  ward: string | null;
  boundThumbprint: string | null;
  state: string;
  issuedAt: number;
  firstUsedAt: number | null;
  lastUsedAt: number | null;
  expiresAt: number;
  overlapEndsAt: number | null;
  renewalAskedAt: number | null;
  endReason: string | null;
  lastHeardAt: number | null;
  version: number;
}

const columns = {
  id: credential.id,
  label: credential.label,
  deviceId: device.id,
  assetTag: device.assetTag,
  model: deviceModel.name,
  ward: ward.name,
  boundThumbprint: credential.boundThumbprint,
  state: credential.state,
  issuedAt: credential.issuedAt,
  firstUsedAt: credential.firstUsedAt,
  lastUsedAt: credential.lastUsedAt,
  expiresAt: credential.expiresAt,
  overlapEndsAt: credential.overlapEndsAt,
  renewalAskedAt: credential.renewalAskedAt,
  endReason: credential.endReason,
  lastHeardAt: device.lastHeardAt,
  version: credential.version,
};

const joined = (services: Pick<Services, 'read'>) =>
  services.read
    .select(columns)
    .from(credential)
    .innerJoin(device, eq(device.id, credential.deviceId))
    .innerJoin(deviceModel, eq(deviceModel.id, device.modelId))
    .leftJoin(ward, eq(ward.id, device.wardId));

/** Credentials by when they end, soonest first; a page at a time. */
export async function listCredentials(
  services: Pick<Services, 'read' | 'clock'>,
  _by: Authorized<'credential.read'>,
  filter: CredentialFilter,
): Promise<{ rows: CredentialLine[]; next: string | null }> {
  const now = services.clock.now();
  const pattern = `%${filter.q.replace(/[\\%_]/g, (c) => `\\${c}`)}%`;
  const [afterEnd, afterId] = (filter.after ?? '').split(' ');
  const rows = await joined(services)
    .where(
      and(
        viewOf(filter.view, now),
        filter.q === ''
          ? undefined
          : sql`(${device.assetTag} like ${pattern} escape '\\' or ${device.serialNumber} like ${pattern} escape '\\' or ${credential.label} like ${pattern} escape '\\' or ${credential.boundThumbprint} like ${pattern} escape '\\')`,
        afterId === undefined
          ? undefined
          : sql`(${credential.expiresAt}, ${credential.id}) > (${Number(afterEnd)}, ${afterId})`,
      ),
    )
    .orderBy(asc(credential.expiresAt), asc(credential.id))
    .limit(filter.limit + 1);
  const page = rows.slice(0, filter.limit);
  const last = page.at(-1);
  return { rows: page, next: rows.length > filter.limit && last ? `${last.expiresAt} ${last.id}` : null };
}

/** How many stand in each view, for the sentence and the chips. */
export async function countCredentials(
  services: Pick<Services, 'read' | 'clock'>,
  _by: Authorized<'credential.read'>,
): Promise<Record<CredentialFilter['view'], number>> {
  const now = services.clock.now();
  const count = async (view: CredentialFilter['view']) => {
    const [row] = await services.read
      .select({ n: sql<number>`count(*)` })
      .from(credential)
      .where(viewOf(view, now));
    return row?.n ?? 0;
  };
  const views = CredentialFilter.shape.view.unwrap().options;
  const counts = await Promise.all(views.map(async (view) => [view, await count(view)] as const));
  return Object.fromEntries(counts) as Record<CredentialFilter['view'], number>;
}
