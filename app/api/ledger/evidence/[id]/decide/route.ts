import { DecideEvidence, decideEvidence } from '@/lib/custody/evidence/decideEvidence';
import { personRoute } from '@/lib/http/person';

/** Approve or refuse the evidence package that somebody else asked for. */
export const POST = personRoute(
  'POST /api/ledger/evidence/[id]/decide',
  { body: DecideEvidence },
  async ({ person, body, params, services, idempotency }) =>
    Response.json(
      await idempotency.once((remember) => decideEvidence(services, person, params.id ?? '', body, remember)),
    ),
);
