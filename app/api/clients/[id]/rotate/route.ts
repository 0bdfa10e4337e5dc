import { Rotation, rotateSecret } from '@/lib/clients/rotateSecret';
import { personRoute } from '@/lib/http/person';

/** A new secret for an API client. It is in this answer and nowhere else. */
export const POST = personRoute(
  'POST /api/clients/[id]/rotate',
  { body: Rotation },
  async ({ person, body, params, services, idempotency }) =>
    Response.json(
      await idempotency.once((remember) => rotateSecret(services, person, params.id ?? '', body, remember)),
    ),
);
