import { eq } from 'drizzle-orm';
import { session } from '@/db/schema';
import type { Authorized } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';
import { callAuth, type Peer } from './callAuth';
import { deleteSessions } from './sessions';

/** End the session that a request came in by. @returns Set-Cookie lines that take its cookies away */
export async function signOut(
  services: Pick<Services, 'database' | 'read' | 'write' | 'env' | 'log'>,
  by: Authorized<'self'>,
  peer: Peer,
): Promise<{ cookies: string[] }> {
  // Ours first: what Better Auth answers only takes the cookies away.
  await services.write((tx) => deleteSessions(tx, by.id, eq(session.id, by.sessionId)));
  const { cookies } = await callAuth(services, peer, '/sign-out', {});
  return { cookies };
}
