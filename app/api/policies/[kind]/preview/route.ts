import { personRoute } from '@/lib/http/person';
import { PolicyPreview, previewPolicy } from '@/lib/policy/changePolicy';

/** What a change of a policy would do. Nothing is written. */
export const POST = personRoute(
  'POST /api/policies/[kind]/preview',
  { body: PolicyPreview },
  async ({ person, body, params, services }) =>
    Response.json(await previewPolicy(services, person, params.kind ?? '', body.settings)),
);
