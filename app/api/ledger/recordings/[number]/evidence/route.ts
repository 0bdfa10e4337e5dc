import { AskEvidence, askEvidence } from '@/lib/custody/evidence/askEvidence';
import { personRoute } from '@/lib/http/person';

/** Ask for a recording's evidence package. */
export const POST = personRoute(
  'POST /api/ledger/recordings/[number]/evidence',
  { body: AskEvidence },
  async ({ person, body, params, services, idempotency }) =>
    Response.json(
      await idempotency.once((remember) =>
        askEvidence(services, person, params.number ?? '', body, remember),
      ),
    ),
);
