import { issueToken, TokenRequest } from '@/lib/clients/issueToken';
import { readForm, tokenRoute } from '@/lib/http/client';

/** A short access token for another system, by client credentials. */
export const POST = tokenRoute('POST /api/v1/token', async ({ request, services }) =>
  Response.json(
    await issueToken(services, request.headers.get('authorization'), await readForm(request, TokenRequest)),
    { headers: { pragma: 'no-cache' } },
  ),
);
