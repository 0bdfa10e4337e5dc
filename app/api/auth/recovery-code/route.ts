import { withCookies } from '@/lib/http/cookies';
import { publicRoute } from '@/lib/http/person';
import { passSecondFactor, RecoveryCode } from '@/lib/identity/passSecondFactor';

/** Second step without the authenticator: a recovery code, which works once. */
export const POST = publicRoute(
  'POST /api/auth/recovery-code',
  { body: RecoveryCode },
  async ({ body, peer, services }) => {
    const { next, cookies } = await passSecondFactor(services, peer, 'recovery-code', body.code);
    return withCookies(Response.json({ next }), cookies);
  },
);
