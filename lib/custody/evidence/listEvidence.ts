import { desc, eq } from 'drizzle-orm';
import { evidenceRequest, user } from '@/db/schema';
import type { Services } from '@/lib/platform/services';

export interface EvidenceLine {
  id: string;
  reason: string;
  askedBy: { id: string; name: string };
  askedAt: number;
  decision: 'not-needed' | 'approved' | 'refused' | null;
  decidedAt: number | null;
}

const MOST = 20;

/** The latest requests for a recording's evidence. */
export async function listEvidence(
  services: Pick<Services, 'read'>,
  recordingId: string,
): Promise<EvidenceLine[]> {
  const rows = await services.read
    .select({ request: evidenceRequest, name: user.name })
    .from(evidenceRequest)
    .innerJoin(user, eq(user.id, evidenceRequest.askedBy))
    .where(eq(evidenceRequest.recordingId, recordingId))
    .orderBy(desc(evidenceRequest.askedAt), desc(evidenceRequest.id))
    .limit(MOST);
  return rows.map(({ request, name }) => ({
    id: request.id,
    reason: request.reason,
    askedBy: { id: request.askedBy, name },
    askedAt: request.askedAt,
    decision: request.decision,
    decidedAt: request.decidedAt,
  }));
}
