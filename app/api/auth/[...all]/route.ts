import { clientAddress } from '@/lib/http/clientAddress';
import { answerPerson } from '@/lib/http/person';
import { authOf, PEER_FIELD } from '@/lib/identity/auth';
import { Refusal } from '@/lib/platform/errors';

/** The calls of Better Auth that our pages make. Every other one it has does not exist here. */
const LET_THROUGH: Record<string, readonly string[]> = {
  GET: ['/get-session', '/list-sessions'],
  POST: [
    '/sign-in/email',
    '/sign-out',
    '/request-password-reset',
    '/reset-password',
    '/change-password',
    '/revoke-session',
    '/revoke-other-sessions',
    '/two-factor/enable',
    '/two-factor/verify-totp',
    '/two-factor/verify-backup-code',
    '/two-factor/generate-backup-codes',
  ],
};

const handle = (request: Request): Promise<Response> =>
  answerPerson(request, async (services) => {
    const path = new URL(request.url).pathname.replace(/^\/api\/auth/, '');
    if (!LET_THROUGH[request.method]?.includes(path)) throw new Refusal('not-found');
    const headers = new Headers(request.headers);
    headers.set(PEER_FIELD, clientAddress(services, request));
    const response = await authOf(services).handler(new Request(request, { headers }));
    return new Response(response.body, response);
  });

export { handle as GET, handle as POST };
