import type { z } from 'zod';
import { type AuthorizedClient, authorizeClient } from '@/lib/clients/authorizeClient';
import type { Scope } from '@/lib/contract/scopes';
import { accessOf, type ClientRouteKey, type ScopeOf } from '@/lib/identity/routes';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { spend } from './limits';
import { answerCall, parseQuery, peerOf, type Route } from './person';

interface ClientContext<K extends ClientRouteKey, Query> {
  client: AuthorizedClient<ScopeOf<K>>;
  query: Query;
  services: Services;
}

/** A route that other systems call with a token of their own: authenticates, checks the scope, parses, calls one verb. */
export function clientRoute<K extends ClientRouteKey, Q extends z.ZodType>(
  key: K,
  schemas: { query: Q },
  handler: (context: ClientContext<K, z.infer<Q>>) => Promise<Response>,
): Route {
  const answer = (request: Request) =>
    answerCall(key, async (services, _requestId, fields) => {
      await spend('address', peerOf(services, request).address);
      const scope = accessOf(key).client as Scope;
      const client = (await authorizeClient(
        services,
        request.headers.get('authorization'),
        scope,
      )) as AuthorizedClient<ScopeOf<K>>;
      const left = await spend('person', `client ${client.id}`);
      for (const [name, value] of Object.entries(left)) fields.set(name, value);
      const query = parseQuery(new URL(request.url), schemas.query) as z.infer<Q>;
      return await handler({ client, query, services });
    });
  return Object.assign(answer, { routeKey: key });
}

/**
 * The route at which another system asks for a token. No cookie counts here, so no Origin is asked for. Refusals are
 * problems that carry the `error` of RFC 6749, 5.2, as plain JSON, which clients of that standard read.
 */
export function tokenRoute(
  key: 'POST /api/v1/token',
  handler: (context: { request: Request; services: Services }) => Promise<Response>,
): Route {
  const answer = async (request: Request) => {
    const response = await answerCall(key, async (services) => {
      await spend('address-writes', `token ${peerOf(services, request).address}`);
      return await handler({ request, services });
    });
    if (!response.ok) response.headers.set('content-type', 'application/json');
    return response;
  };
  return Object.assign(answer, { routeKey: key });
}

const LARGEST_FORM_BYTES = 16_384;

/**
 * A body as HTML forms send it, each member once (RFC 6749, 3.2).
 *
 * @throws Refusal `media-type-unsupported`, `body-too-large`, `body-invalid` with the `error` of RFC 6749, 5.2
 */
export async function readForm<S extends z.ZodType>(request: Request, schema: S): Promise<z.infer<S>> {
  const type = request.headers.get('content-type') ?? '';
  if (!/^application\/x-www-form-urlencoded\s*(?:;|$)/i.test(type))
    throw new Refusal('media-type-unsupported');
  const text = await request.text();
  if (text.length > LARGEST_FORM_BYTES) throw new Refusal('body-too-large');
  const members = [...new URLSearchParams(text)];
  const names = members.map(([name]) => name);
  const parsed =
    new Set(names).size === names.length ? schema.safeParse(Object.fromEntries(members)) : undefined;
  if (!parsed?.success)
    throw new Refusal('body-invalid', 'The form is not right.', {
      error: 'invalid_request',
      errors: (parsed?.error.issues ?? []).map(({ path, message }) => ({ path: path.join('.'), message })),
    });
  return parsed.data;
}
