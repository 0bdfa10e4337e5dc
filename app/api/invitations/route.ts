import { personRoute } from '@/lib/http/person';
import { Invitation, invitePerson } from '@/lib/identity/invitePerson';
import { countInvitations, InvitationFilter, listInvitations } from '@/lib/identity/listInvitations';

/** Invitations a page at a time, with how many stand in each view. */
export const GET = personRoute(
  'GET /api/invitations',
  { query: InvitationFilter },
  async ({ person, query, services }) => {
    const [page, counts] = await Promise.all([
      listInvitations(services, person, query),
      countInvitations(services, person),
    ]);
    return Response.json({ ...page, counts });
  },
);

/** Invite somebody. */
export const POST = personRoute(
  'POST /api/invitations',
  { body: Invitation },
  async ({ person, body, services, idempotency }) =>
    Response.json(await idempotency.once((remember) => invitePerson(services, person, body, remember)), {
      status: 201,
    }),
);
