import { z } from 'zod';
import { publicRoute } from '@/lib/http/person';
import { beginPasskeySignIn } from '@/lib/identity/passkeys/signInByPasskey';

/** What a browser is asked to sign with a passkey. */
export const POST = publicRoute(
  'POST /api/auth/passkey/options',
  { body: z.strictObject({}) },
  async ({ services }) => Response.json(await beginPasskeySignIn(services)),
);
