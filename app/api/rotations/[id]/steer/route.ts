import { personRoute } from '@/lib/http/person';
import { Steering, steerRun } from '@/lib/rotation/steerRun';

/** Pause, resume or cancel a rotation run. */
export const POST = personRoute(
  'POST /api/rotations/[id]/steer',
  { body: Steering },
  async ({ person, body, params, services, idempotency }) =>
    Response.json(
      await idempotency.once((remember) => steerRun(services, person, params.id ?? '', body, remember)),
    ),
);
