import { and, eq, gt, isNull } from 'drizzle-orm';
import { invitation } from '@/db/schema';
import type { Services } from '@/lib/platform/services';
import type { Role } from './permissions';
import { tokenHash } from './tokenHash';

export interface OpenInvitation {
  id: string;
  email: string;
  name: string;
  jobTitle: string | null;
  roles: Role[];
  wardIds: string[];
  expiresAt: number;
}

export const rolesOf = (text: string): Role[] => text.split(',').filter(Boolean) as Role[];
export const wardsOf = (text: string): string[] => text.split(',').filter(Boolean);

/** The condition for an invitation that can be taken up now. */
export const isOpen = (nowMs: number) =>
  and(isNull(invitation.acceptedAt), isNull(invitation.withdrawnAt), gt(invitation.expiresAt, nowMs));

/** The open invitation that a token from a mail stands for; null when it was used, withdrawn, has ended, or never was. */
export async function readInvitation(
  services: Pick<Services, 'read' | 'clock'>,
  token: string,
): Promise<OpenInvitation | null> {
  const [row] = await services.read
    .select()
    .from(invitation)
    .where(and(eq(invitation.tokenHash, tokenHash(token)), isOpen(services.clock.now())))
    .limit(1);
  if (!row) return null;
  return {
    id: row.id,
    email: row.email,
    name: row.name,
    jobTitle: row.jobTitle,
    roles: rolesOf(row.roles),
    wardIds: wardsOf(row.wardIds),
    expiresAt: row.expiresAt,
  };
}
