import { personRoute } from '@/lib/http/person';
import { giveRole, RoleChange } from '@/lib/identity/giveRole';
import { takeRole } from '@/lib/identity/takeRole';

/** Give a role or take it away. The person's sessions end at once. */
export const POST = personRoute(
  'POST /api/people/[id]/roles',
  { body: RoleChange },
  async ({ person, body, params, services, idempotency }) => {
    const change = body.held ? giveRole : takeRole;
    return Response.json(
      await idempotency.once((remember) => change(services, person, params.id ?? '', body.role, remember)),
    );
  },
);
