import { and, desc, eq, isNotNull, isNull, lt, or, sql } from 'drizzle-orm';
import { z } from 'zod';
import { apiClient, user } from '@/db/schema';
import type { Authorized } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';

export const ClientFilter = z.strictObject({
  view: z.enum(['living', 'revoked']).default('living'),
  q: z.string().trim().max(100).default(''),
  /** Keyset: `createdAt id` of the last row of the page before. */
  after: z
    .string()
    .regex(/^\d+ [\w-]+$/)
    .optional(),
  limit: z.coerce.number().int().min(1).max(200).default(50),
});
export type ClientFilter = z.infer<typeof ClientFilter>;

export interface ClientLine {
  id: string;
  name: string;
  scopes: string[];
  method: 'client_secret_basic' | 'private_key_jwt';
  createdAt: number;
  createdBy: string;
  lastUsedAt: number | null;
  /** The secret before works until here. */
  previousEndsAt: number | null;
  revokedAt: number | null;
  version: number;
}

/** API clients, the latest first. No secret and no hash of one. */
export async function readClients(
  services: Pick<Services, 'read'>,
  _by: Authorized<'connections.read'>,
  filter: ClientFilter,
): Promise<{ rows: ClientLine[]; next: string | null }> {
  const [at, id] = filter.after?.split(' ') ?? [];
  const rows = await services.read
    .select({
      id: apiClient.id,
      name: apiClient.name,
      scopes: apiClient.scopes,
      method: apiClient.method,
      createdAt: apiClient.createdAt,
      createdBy: user.name,
      lastUsedAt: apiClient.lastUsedAt,
      previousEndsAt: apiClient.previousEndsAt,
      revokedAt: apiClient.revokedAt,
      version: apiClient.version,
    })
    .from(apiClient)
    .innerJoin(user, eq(user.id, apiClient.createdBy))
    .where(
      and(
        filter.view === 'living' ? isNull(apiClient.revokedAt) : isNotNull(apiClient.revokedAt),
        filter.q === ''
          ? undefined
          : or(
              eq(apiClient.id, filter.q),
              sql`${apiClient.name} like ${`%${filter.q.replace(/[\\%_]/g, (c) => `\\${c}`)}%`} escape '\\'`,
            ),
        at && id
          ? or(
              lt(apiClient.createdAt, Number(at)),
              and(eq(apiClient.createdAt, Number(at)), lt(apiClient.id, id)),
            )
          : undefined,
      ),
    )
    .orderBy(desc(apiClient.createdAt), desc(apiClient.id))
    .limit(filter.limit + 1);
  const page = rows.slice(0, filter.limit);
  const last = page.at(-1);
  return {
    rows: page,
    next: rows.length > filter.limit && last ? `${last.createdAt} ${last.id}` : null,
  };
}
