import { publicRoute } from '@/lib/http/person';
import { NewPassword, resetPassword } from '@/lib/identity/resetPassword';

/** Set a new password by the token that came by mail. */
export const POST = publicRoute('POST /api/auth/reset', { body: NewPassword }, async ({ body, services }) => {
  await resetPassword(services, body);
  return Response.json({ done: true });
});
