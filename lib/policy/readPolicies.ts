import { and, desc, eq, lt } from 'drizzle-orm';
import { policyVersion, user } from '@/db/schema';
import type { Authorized } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';
import { currentPolicy, mergedSettings } from './currentPolicy';
import {
  type AnySettings,
  initialSettings,
  isPolicyKind,
  POLICY_KINDS,
  type PolicyField,
  type PolicyKind,
  policyKind,
} from './kinds';

export interface PolicyVersionLine {
  version: number;
  madeAt: number;
  madeBy: string;
  reason: string;
  /** What was changed against the version before. */
  changes: { label: string; unit: string; before: number | boolean; after: number | boolean }[];
}

export interface PolicyDescription {
  kind: PolicyKind;
  title: string;
  about: string;
  fields: Record<string, PolicyField>;
  settings: AnySettings;
  version: number;
}

/** Every kind with what is in force, and when it was decided. */
export async function readPolicies(
  services: Pick<Services, 'read' | 'env'>,
  _by: Authorized<'policy.read'>,
): Promise<(PolicyDescription & { changedAt: number | null })[]> {
  return await Promise.all(
    (Object.keys(POLICY_KINDS) as PolicyKind[]).map(async (kind) => {
      const described = await inForce(services, kind);
      const [last] = await versionsOf(services, kind, undefined, 1);
      return { ...described, changedAt: last?.madeAt ?? null };
    }),
  );
}

async function inForce(
  services: Pick<Services, 'read' | 'env'>,
  kind: PolicyKind,
): Promise<PolicyDescription> {
  const { title, about, fields } = policyKind(kind);
  const { settings, version } = await currentPolicy(services.read, kind, services.env);
  return { kind, title, about, fields, settings, version };
}

const versionsOf = (
  services: Pick<Services, 'read' | 'env'>,
  kind: PolicyKind,
  before: number | undefined,
  limit: number,
) =>
  services.read
    .select({ row: policyVersion, name: user.name, madeAt: policyVersion.madeAt })
    .from(policyVersion)
    .leftJoin(user, eq(user.id, policyVersion.madeBy))
    .where(
      and(eq(policyVersion.kind, kind), before === undefined ? undefined : lt(policyVersion.version, before)),
    )
    .orderBy(desc(policyVersion.version))
    .limit(limit);

/**
 * One kind, with its history, the latest first.
 *
 * @param before only versions older than this one
 * @returns null for an unknown kind
 */
export async function readPolicy(
  services: Pick<Services, 'read' | 'env'>,
  _by: Authorized<'policy.read'>,
  kind: string,
  before?: number,
): Promise<(PolicyDescription & { history: PolicyVersionLine[]; next: number | null }) | null> {
  if (!isPolicyKind(kind)) return null;
  const limit = 25;
  // One more than is shown: each is told against the one before it.
  const rows = await versionsOf(services, kind, before, limit + 1);
  const fields = policyKind(kind).fields;
  const history = rows.slice(0, limit).map(({ row, name }, index) => {
    const after: AnySettings = mergedSettings(kind, row.settings);
    const older = rows[index + 1];
    const previous: AnySettings = older ? mergedSettings(kind, older.row.settings) : initialSettings(kind);
    return {
      version: row.version,
      madeAt: row.madeAt,
      madeBy: name ?? row.madeBy,
      reason: row.reason,
      changes: Object.entries(fields).flatMap(([field, { label, ...rest }]) => {
        const [was, is] = [previous[field], after[field]];
        if (was === is || was === undefined || is === undefined) return [];
        return [{ label, unit: 'unit' in rest ? rest.unit : '', before: was, after: is }];
      }),
    };
  });
  return {
    ...(await inForce(services, kind)),
    history,
    next: rows.length > limit ? (history.at(-1)?.version ?? null) : null,
  };
}
