import { z } from 'zod';
import { issueEnrolmentCode } from '@/lib/enrolment/issueCode';
import { personRoute } from '@/lib/http/person';
import { personActor } from '@/lib/platform/authority';

/** A fresh one-time enrolment code. It is in this answer and nowhere else, so a repeat makes another one. */
export const POST = personRoute(
  'POST /api/devices/[id]/code',
  { body: z.strictObject({}) },
  async ({ person, params, services }) =>
    Response.json(await issueEnrolmentCode(services, personActor(person, 'fleet.write'), params.id ?? ''), {
      status: 201,
    }),
);
