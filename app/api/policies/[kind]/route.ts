import { personRoute } from '@/lib/http/person';
import { changePolicy, PolicyChange } from '@/lib/policy/changePolicy';

/** Decide on a policy: a new version, in force at once. */
export const POST = personRoute(
  'POST /api/policies/[kind]',
  { body: PolicyChange },
  async ({ person, body, params, services, idempotency }) =>
    Response.json(
      await idempotency.once((remember) => changePolicy(services, person, params.kind ?? '', body, remember)),
    ),
);
