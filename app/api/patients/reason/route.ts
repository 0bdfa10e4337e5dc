import { z } from 'zod';
import { personRoute } from '@/lib/http/person';
import { giveReason } from '@/lib/records/patientAccess';

const Body = z.strictObject({
  identifier: z.string().trim().min(3).max(64),
  reason: z.string().trim().min(5).max(500),
});

/** Open a patient outside one's wards by giving the reason. */
export const POST = personRoute(
  'POST /api/patients/reason',
  { body: Body },
  async ({ person, body, services, idempotency }) =>
    Response.json(await idempotency.once((remember) => giveReason(services, person, body, remember))),
);
