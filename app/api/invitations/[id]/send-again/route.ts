import { personRoute } from '@/lib/http/person';
import { sendInvitationAgain } from '@/lib/identity/sendInvitationAgain';

/** Send an open invitation once more; the address in the mail before stops working. */
export const POST = personRoute(
  'POST /api/invitations/[id]/send-again',
  {},
  async ({ person, params, services, idempotency }) =>
    Response.json(
      await idempotency.once((remember) => sendInvitationAgain(services, person, params.id ?? '', remember)),
    ),
);
