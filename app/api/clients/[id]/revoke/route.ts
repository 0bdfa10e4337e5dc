import { Revocation, revokeClient } from '@/lib/clients/revokeClient';
import { personRoute } from '@/lib/http/person';

/** Another system reads no more. */
export const POST = personRoute(
  'POST /api/clients/[id]/revoke',
  { body: Revocation },
  async ({ person, body, params, services, idempotency }) =>
    Response.json(
      await idempotency.once((remember) => revokeClient(services, person, params.id ?? '', body, remember)),
    ),
);
