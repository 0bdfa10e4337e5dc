import { z } from 'zod';
import { revokeCredential } from '@/lib/credentials/revokeCredential';
import { personRoute } from '@/lib/http/person';

const Body = z.strictObject({ version: z.number().int(), reason: z.string().trim().min(5).max(500) });

/** Revoke a credential and its family, at once. */
export const POST = personRoute(
  'POST /api/credentials/[id]/revoke',
  { body: Body },
  async ({ person, body, params, services, idempotency }) =>
    Response.json(
      await idempotency.once((remember) =>
        revokeCredential(services, person, { id: params.id ?? '', ...body }, remember),
      ),
    ),
);
