import { personRoute } from '@/lib/http/person';
import { distrustSigningKey, KeyChange } from '@/lib/keys/changeSigningKey';

/** A signing key is known to somebody: it is trusted no more, and devices renew by their own keys. */
export const POST = personRoute(
  'POST /api/signing-keys/distrust',
  { body: KeyChange },
  async ({ person, body, services, idempotency }) =>
    Response.json(await idempotency.once((remember) => distrustSigningKey(services, person, body, remember))),
);
