import { randomUUID } from 'node:crypto';
import { z } from 'zod';
import type { Peer } from '@/lib/identity/callAuth';
import { may } from '@/lib/identity/permissions';
import { readPerson, type SignedIn } from '@/lib/identity/readPerson';
import {
  accessOf,
  type PermissionOf,
  type PersonRouteKey,
  type PublicRouteKey,
  type RouteKey,
} from '@/lib/identity/routes';
import type { Authorized } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { readJson } from './body';
import { clientAddress } from './clientAddress';
import { type Idempotency, idempotencyOf } from './idempotency';
import { spend } from './limits';
import { problemResponse } from './problem';
import { getServices } from './services';

type Params = Record<string, string>;
/** What Next hands to a route beside the request: nothing where the address has no parameters, an array for a catch-all. */
type RouteContext = { params: Promise<Record<string, string | string[] | undefined> | undefined> };

interface Common<Body, Query> {
  body: Body;
  query: Query;
  params: Params;
  services: Services;
  requestId: string;
  request: Request;
  peer: Peer;
}
interface PersonContext<K extends PersonRouteKey, Body, Query> extends Common<Body, Query> {
  person: Authorized<PermissionOf<K>>;
  idempotency: Idempotency;
}
interface Schemas<B, Q> {
  body?: B;
  query?: Q;
}
export interface Route {
  (request: Request, route: RouteContext): Promise<Response>;
  /** Its line in the table of routes. */
  routeKey: RouteKey;
}

const LARGEST_BODY_BYTES = 262_144;
const NOTHING = z.unknown();

/** In the log only: to the caller, what one may not see and what does not exist are the same. */
class NotPermitted extends Error {
  override readonly name = 'NotPermitted';
}

/**
 * Refuse writes that another site sends with a person's cookie. The Origin must be ours; a form without scripts sends
 * `null` under our referrer policy (Fetch, 3.2), and then the browser's own word (Fetch Metadata) must say that it is
 * from here. No page can set either field.
 */
function checkOrigin(request: Request, ours: string): void {
  if (request.method === 'GET' || request.method === 'HEAD') return;
  const origin = request.headers.get('origin');
  const site = request.headers.get('sec-fetch-site');
  const fromHere =
    origin === ours
      ? site === null || site === 'same-origin' || site === 'none'
      : origin === 'null' && site === 'same-origin';
  if (!fromHere) throw new Refusal('origin-refused');
}

/** Answer a request, with an id in every answer and log line and a problem for every refusal. */
export async function answerCall(
  key: RouteKey,
  work: (services: Services, requestId: string, fields: Headers) => Promise<Response>,
): Promise<Response> {
  const requestId = randomUUID();
  const services = await getServices();
  const started = performance.now();
  // The line of the table and not the address: addresses hold numbers of patients and recordings, and tokens.
  const about = { requestId, route: key };
  const fields = new Headers();
  try {
    const response = await work(services, requestId, fields);
    for (const [name, value] of fields) response.headers.set(name, value);
    response.headers.set('x-request-id', requestId);
    if (!response.headers.has('cache-control')) response.headers.set('cache-control', 'no-store');
    if (!response.headers.has('x-content-type-options'))
      response.headers.set('x-content-type-options', 'nosniff');
    services.log.debug(
      { ...about, status: response.status, ms: Math.round(performance.now() - started) },
      'call',
    );
    return response;
  } catch (error) {
    const refusal = error instanceof Refusal ? error : new Refusal('fault', undefined, {}, { cause: error });
    services.log[refusal.code === 'fault' ? 'error' : 'info'](
      { ...about, problem: refusal.code, err: refusal.cause },
      'call refused',
    );
    return problemResponse(refusal.code, {
      detail: refusal.detail,
      extra: refusal.extra,
      requestId,
      origin: services.env.BELLKEEP_ORIGIN,
      headers: { ...Object.fromEntries(fields), ...refusal.headers },
    });
  }
}

/** Check a signed-in person's authority for a route. @throws Refusal */
function authorize<K extends PersonRouteKey>(person: SignedIn | null, key: K): Authorized<PermissionOf<K>> {
  if (!person) throw new Refusal('sign-in-required');
  const access = accessOf(key);
  if (!access.permission || !may(person.roles, access.permission))
    throw new Refusal('not-found', undefined, {}, { cause: new NotPermitted(key) });
  if (person.needsSecondFactor && !access.beforeSecondFactor) throw new Refusal('second-factor-required');
  return person as unknown as Authorized<PermissionOf<K>>;
}

async function paramsOf(route: RouteContext): Promise<Params> {
  const params: Params = {};
  for (const [name, value] of Object.entries((await route.params) ?? {}))
    if (value !== undefined) params[name] = [value].flat().join('/');
  return params;
}

export function parseQuery(url: URL, schema: z.ZodType | undefined): unknown {
  if (!schema) return undefined;
  const parsed = schema.safeParse(Object.fromEntries(url.searchParams));
  if (parsed.success) return parsed.data;
  const errors = parsed.error.issues.map((issue) => ({ path: issue.path.join('.'), message: issue.message }));
  throw new Refusal('body-invalid', 'The address has parameters that are not right.', { errors });
}

export const peerOf = (services: Services, request: Request): Peer => ({
  address: clientAddress(services, request),
  headers: request.headers,
});

/**
 * A route for people: checks origin, session, permission and limits, parses, calls the handler, answers.
 *
 * @param key its line in the table of routes; a route that is not in it does not compile
 */
export function personRoute<
  K extends PersonRouteKey,
  B extends z.ZodType = typeof NOTHING,
  Q extends z.ZodType = typeof NOTHING,
>(
  key: K,
  schemas: Schemas<B, Q>,
  handler: (context: PersonContext<K, z.infer<B>, z.infer<Q>>) => Promise<Response>,
): Route {
  const answer = (request: Request, route: RouteContext) =>
    answerCall(key, async (services, requestId, fields) => {
      checkOrigin(request, services.env.BELLKEEP_ORIGIN);
      const peer = peerOf(services, request);
      await spend('address', peer.address);
      const person = authorize(await readPerson(services, request.headers), key);
      const left = await spend('person', person.id);
      for (const [name, value] of Object.entries(left)) fields.set(name, value);
      const params = await paramsOf(route);
      const query = parseQuery(new URL(request.url), schemas.query) as z.infer<Q>;
      const body = (
        schemas.body ? await readJson(request, schemas.body, LARGEST_BODY_BYTES) : undefined
      ) as z.infer<B>;
      const idempotency = idempotencyOf(services, request, person.id, key, body, params);
      const common = { body, query, params, services, requestId, request, peer };
      const response = await handler({ person, idempotency, ...common });
      if (idempotency.replayed()) fields.set('idempotency-replayed', 'true');
      return response;
    });
  return Object.assign(answer, { routeKey: key });
}

/** A route that anybody may call: checks the origin of writes and counts by address. */
export function publicRoute<B extends z.ZodType = typeof NOTHING, Q extends z.ZodType = typeof NOTHING>(
  key: PublicRouteKey,
  schemas: Schemas<B, Q>,
  handler: (context: Common<z.infer<B>, z.infer<Q>>) => Promise<Response>,
): Route {
  const answer = (request: Request, route: RouteContext) =>
    answerCall(key, async (services, requestId, fields) => {
      checkOrigin(request, services.env.BELLKEEP_ORIGIN);
      const peer = peerOf(services, request);
      const left = await spend(request.method === 'GET' ? 'address' : 'address-writes', peer.address);
      for (const [name, value] of Object.entries(left)) fields.set(name, value);
      const params = await paramsOf(route);
      const query = parseQuery(new URL(request.url), schemas.query) as z.infer<Q>;
      const body = (
        schemas.body ? await readJson(request, schemas.body, LARGEST_BODY_BYTES) : undefined
      ) as z.infer<B>;
      return await handler({ body, query, params, services, requestId, request, peer });
    });
  return Object.assign(answer, { routeKey: key });
}
