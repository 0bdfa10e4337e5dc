import { personRoute } from '@/lib/http/person';
import { withdrawInvitation } from '@/lib/identity/withdrawInvitation';

/** Withdraw an open invitation. */
export const POST = personRoute(
  'POST /api/invitations/[id]/withdraw',
  {},
  async ({ person, params, services, idempotency }) =>
    Response.json(
      await idempotency.once((remember) => withdrawInvitation(services, person, params.id ?? '', remember)),
    ),
);
