import { desc, eq } from 'drizzle-orm';
import type { Reader } from '@/db/client';
import { policyVersion } from '@/db/schema';
import type { Tx } from '@/db/write';
import type { Env } from '@/lib/platform/env';
import { type AnySettings, initialSettings, type PolicyKind, type PolicySettings } from './kinds';

export interface CurrentPolicy<K extends PolicyKind> {
  /** 0: nobody decided yet, the initial values are in force. */
  version: number;
  settings: PolicySettings<K>;
}

/** What the environment says until somebody decides. */
const fromEnvironment = (env: Pick<Env, 'RETENTION_YEARS'>): { [K in PolicyKind]?: AnySettings } => ({
  retention: { originalYears: env.RETENTION_YEARS },
});

/**
 * What is in force for a kind. A field that no version had yet has its initial value.
 *
 * @param env where the environment may say something until there is a first version
 */
export async function currentPolicy<K extends PolicyKind>(
  read: Reader | Tx,
  kind: K,
  env?: Pick<Env, 'RETENTION_YEARS'>,
): Promise<CurrentPolicy<K>> {
  const [row] = await read
    .select()
    .from(policyVersion)
    .where(eq(policyVersion.kind, kind))
    .orderBy(desc(policyVersion.version))
    .limit(1);
  const stored = row?.settings ?? (env ? (fromEnvironment(env)[kind] ?? {}) : {});
  return { version: row?.version ?? 0, settings: mergedSettings(kind, stored) };
}

/** Settings of a stored version, as the kind has its fields today. */
export function mergedSettings<K extends PolicyKind>(
  kind: K,
  stored: Record<string, unknown>,
): PolicySettings<K> {
  const initial: Record<string, unknown> = initialSettings(kind);
  const known = Object.entries(stored).filter(
    ([name, value]) => name in initial && typeof value === typeof initial[name],
  );
  return { ...initial, ...Object.fromEntries(known) } as PolicySettings<K>;
}
