import { personRoute } from '@/lib/http/person';
import { changePassword, PasswordChange } from '@/lib/identity/changePassword';

/** Change one's own password. */
export const POST = personRoute(
  'POST /api/account/password',
  { body: PasswordChange },
  async ({ person, body, services }) => Response.json(await changePassword(services, person, body)),
);
