import { and, desc, eq, isNotNull, isNull, lte, sql } from 'drizzle-orm';
import { z } from 'zod';
import { invitation, user } from '@/db/schema';
import type { Authorized } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';
import type { Role } from './permissions';
import { isOpen, rolesOf } from './readInvitation';

export const InvitationFilter = z.strictObject({
  view: z.enum(['open', 'accepted', 'withdrawn', 'ended']).default('open'),
  /** Keyset: the id of the last row of the page before. */
  after: z.string().max(100).optional(),
  limit: z.coerce.number().int().min(1).max(200).default(50),
});
export type InvitationFilter = z.infer<typeof InvitationFilter>;

export interface InvitationLine {
  id: string;
  name: string;
  email: string;
  jobTitle: string | null;
  roles: Role[];
  invitedBy: string;
  createdAt: number;
  expiresAt: number;
  acceptedAt: number | null;
  withdrawnAt: number | null;
}

type Reads = Pick<Services, 'read' | 'clock'>;

function viewOf(view: InvitationFilter['view'], now: number) {
  switch (view) {
    case 'open':
      return isOpen(now);
    case 'accepted':
      return isNotNull(invitation.acceptedAt);
    case 'withdrawn':
      return isNotNull(invitation.withdrawnAt);
    case 'ended':
      return and(
        isNull(invitation.acceptedAt),
        isNull(invitation.withdrawnAt),
        lte(invitation.expiresAt, now),
      );
  }
}

/** Invitations, the latest first, a page at a time. The token is nowhere to be read: only its hash is kept. */
export async function listInvitations(
  services: Reads,
  _by: Authorized<'people.read'>,
  filter: InvitationFilter,
): Promise<{ rows: InvitationLine[]; next: string | null }> {
  const rows = await services.read
    .select({ invitation, invitedBy: user.name })
    .from(invitation)
    .innerJoin(user, eq(user.id, invitation.invitedBy))
    .where(
      and(
        viewOf(filter.view, services.clock.now()),
        filter.after === undefined
          ? undefined
          : sql`(${invitation.createdAt}, ${invitation.id}) < (select ${invitation.createdAt}, ${invitation.id} from ${invitation} where ${invitation.id} = ${filter.after})`,
      ),
    )
    .orderBy(desc(invitation.createdAt), desc(invitation.id))
    .limit(filter.limit + 1);
  const page = rows.slice(0, filter.limit).map(({ invitation: row, invitedBy }) => ({
    id: row.id,
    name: row.name,
    email: row.email,
    jobTitle: row.jobTitle,
    roles: rolesOf(row.roles),
    invitedBy,
    createdAt: row.createdAt,
    expiresAt: row.expiresAt,
    acceptedAt: row.acceptedAt,
    withdrawnAt: row.withdrawnAt,
  }));
  return { rows: page, next: rows.length > filter.limit ? (page.at(-1)?.id ?? null) : null };
}

/** How many invitations stand in each view. */
export async function countInvitations(
  services: Reads,
  _by: Authorized<'people.read'>,
): Promise<Record<InvitationFilter['view'], number>> {
  const now = services.clock.now();
  const views = InvitationFilter.shape.view.unwrap().options;
  const counts = await Promise.all(
    views.map(async (view) => {
      const [row] = await services.read
        .select({ n: sql<number>`count(*)` })
        .from(invitation)
        .where(viewOf(view, now));
      return [view, row?.n ?? 0] as const;
    }),
  );
  return Object.fromEntries(counts) as Record<InvitationFilter['view'], number>;
}
