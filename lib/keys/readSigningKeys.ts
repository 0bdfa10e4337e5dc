import { and, desc, gt, inArray, sql } from 'drizzle-orm';
import { credential, signingKey } from '@/db/schema';
import type { Authorized } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';

export interface SigningKeyLine {
  kid: string;
  use: (typeof signingKey.$inferSelect)['use'];
  algorithm: string;
  createdAt: number;
  supersededAt: number | null;
  retiredAt: number | null;
  compromisedAt: number | null;
  /** Living credentials that it signed. */
  living: number;
}

/** The service's own keys, youngest first: their public halves and lives; a private half is never read. */
export async function readSigningKeys(
  services: Pick<Services, 'read' | 'clock'>,
  _by: Authorized<'credential.read'>,
): Promise<SigningKeyLine[]> {
  const now = services.clock.now();
  const rows = await services.read
    .select({
      kid: signingKey.kid,
      use: signingKey.use,
      algorithm: signingKey.algorithm,
      createdAt: signingKey.createdAt,
      supersededAt: signingKey.supersededAt,
      retiredAt: signingKey.retiredAt,
      compromisedAt: signingKey.compromisedAt,
    })
    .from(signingKey)
    .orderBy(desc(signingKey.createdAt))
    .limit(200);
  const living = await services.read
    .select({ kid: credential.kid, count: sql<number>`count(*)` })
    .from(credential)
    .where(and(inArray(credential.state, ['issued', 'in-use', 'superseded']), gt(credential.expiresAt, now)))
    .groupBy(credential.kid);
  const counts = new Map(living.map(({ kid, count }) => [kid, count]));
  return rows.map((row) => ({ ...row, living: counts.get(row.kid) ?? 0 }));
}
