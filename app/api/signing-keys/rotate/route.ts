import { personRoute } from '@/lib/http/person';
import { KeyChange, rotateSigningKey } from '@/lib/keys/changeSigningKey';

/** Another key signs device tokens from now on; the one before verifies until nothing needs it. */
export const POST = personRoute(
  'POST /api/signing-keys/rotate',
  { body: KeyChange },
  async ({ person, body, services, idempotency }) =>
    Response.json(await idempotency.once((remember) => rotateSigningKey(services, person, body, remember))),
);
