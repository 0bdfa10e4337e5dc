import { publicRoute } from '@/lib/http/person';
import { ResetWish, startPasswordReset } from '@/lib/identity/startPasswordReset';

/** Ask for the mail by which a new password is set. The answer is the same whether there is such an account or not. */
export const POST = publicRoute('POST /api/auth/forgot', { body: ResetWish }, async ({ body, services }) => {
  await startPasswordReset(services, body);
  return Response.json({ asked: true });
});
