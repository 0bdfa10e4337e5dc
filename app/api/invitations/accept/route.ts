import { publicRoute } from '@/lib/http/person';
import { Acceptance, acceptInvitation } from '@/lib/identity/acceptInvitation';

/** Take up an invitation with a password of one's own. */
export const POST = publicRoute(
  'POST /api/invitations/accept',
  { body: Acceptance },
  async ({ body, services }) => Response.json(await acceptInvitation(services, body), { status: 201 }),
);
