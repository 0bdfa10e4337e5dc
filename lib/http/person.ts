import { randomUUID } from 'node:crypto';
import { RateLimiterMemory, RateLimiterRes } from 'rate-limiter-flexible';
import { z } from 'zod';
import { may } from '@/lib/identity/permissions';
import { readPerson, type SignedIn } from '@/lib/identity/readPerson';
import { accessOf, type PermissionOf, type PersonRouteKey } from '@/lib/identity/routes';
import type { Authorized } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { readJson } from './body';
import { clientAddress } from './clientAddress';
import { type Idempotency, idempotencyOf } from './idempotency';
import { problemResponse } from './problem';
import { getServices } from './services';

interface Context<K extends PersonRouteKey, Body, Query> {
  person: Authorized<PermissionOf<K>>;
  body: Body;
  query: Query;
  params: Record<string, string>;
  services: Services;
  requestId: string;
  request: Request;
  idempotency: Idempotency;
}

const LARGEST_BODY_BYTES = 262_144;
const CALLS_PER_MINUTE = 600;
const shared = globalThis as { bellkeepPersonLimit?: RateLimiterMemory };

async function spend(key: string): Promise<void> {
  shared.bellkeepPersonLimit ??= new RateLimiterMemory({ points: CALLS_PER_MINUTE, duration: 60 });
  try {
    await shared.bellkeepPersonLimit.consume(key);
  } catch (left) {
    if (!(left instanceof RateLimiterRes)) throw left;
    throw new Refusal(
      'too-many-requests',
      undefined,
      {},
      { headers: { 'retry-after': String(Math.max(1, Math.ceil(left.msBeforeNext / 1000))) } },
    );
  }
}

/**
 * Refuse writes that another site sends with a person's cookie: the Origin must be ours, and where a browser says
 * where a request comes from (Fetch Metadata) it must be from here.
 */
function checkOrigin(request: Request, origin: string): void {
  if (request.method === 'GET' || request.method === 'HEAD') return;
  const site = request.headers.get('sec-fetch-site');
  if (
    request.headers.get('origin') !== origin ||
    (site !== null && site !== 'same-origin' && site !== 'none')
  )
    throw new Refusal('origin-refused');
}

/** Answer a request, with an id in every answer and log line and a problem for every refusal. */
export async function answerPerson(
  request: Request,
  work: (services: Services, requestId: string) => Promise<Response>,
): Promise<Response> {
  const requestId = randomUUID();
  const services = await getServices();
  const started = performance.now();
  const path = new URL(request.url).pathname;
  try {
    const response = await work(services, requestId);
    response.headers.set('x-request-id', requestId);
    if (!response.headers.has('cache-control')) response.headers.set('cache-control', 'no-store');
    services.log.debug(
      {
        requestId,
        method: request.method,
        path,
        status: response.status,
        ms: Math.round(performance.now() - started),
      },
      'call',
    );
    return response;
  } catch (error) {
    const refusal = error instanceof Refusal ? error : new Refusal('fault', undefined, {}, { cause: error });
    services.log[refusal.code === 'fault' ? 'error' : 'info'](
      { requestId, method: request.method, path, problem: refusal.code, err: refusal.cause },
      'call refused',
    );
    return problemResponse(refusal.code, {
      detail: refusal.detail,
      extra: refusal.extra,
      requestId,
      origin: services.env.BELLKEEP_ORIGIN,
      headers: refusal.headers,
    });
  }
}

/** Check a signed-in person's authority for a route. @throws Refusal */
function authorize<K extends PersonRouteKey>(person: SignedIn | null, key: K): Authorized<PermissionOf<K>> {
  if (!person) throw new Refusal('sign-in-required');
  const access = accessOf(key);
  // What one may not see and what does not exist answer alike.
  if (!access.permission || !may(person.roles, access.permission)) throw new Refusal('not-found');
  if (person.needsSecondFactor && !access.beforeSecondFactor) throw new Refusal('second-factor-required');
  return person as unknown as Authorized<PermissionOf<K>>;
}

const NOTHING = z.unknown();

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
  schemas: { body?: B; query?: Q },
  handler: (context: Context<K, z.infer<B>, z.infer<Q>>) => Promise<Response>,
) {
  return (request: Request, route: { params: Promise<Record<string, string>> }): Promise<Response> =>
    answerPerson(request, async (services, requestId) => {
      checkOrigin(request, services.env.BELLKEEP_ORIGIN);
      const person = authorize(await readPerson(services, request.headers), key);
      await spend(person.id);
      const params = await route.params;
      const query = parseQuery(new URL(request.url), schemas.query) as z.infer<Q>;
      const body = (
        schemas.body ? await readJson(request, schemas.body, LARGEST_BODY_BYTES) : undefined
      ) as z.infer<B>;
      const idempotency = idempotencyOf(services, request, person.id, key, body, params);
      return await handler({ person, body, query, params, services, requestId, request, idempotency });
    });
}

function parseQuery(url: URL, schema: z.ZodType | undefined): unknown {
  if (!schema) return undefined;
  const parsed = schema.safeParse(Object.fromEntries(url.searchParams));
  if (parsed.success) return parsed.data;
  const errors = parsed.error.issues.map((issue) => ({ path: issue.path.join('.'), message: issue.message }));
  throw new Refusal('body-invalid', 'The address has parameters that are not right.', { errors });
}

/** A route that anybody may call and that writes: checks the origin and counts by address. */
export function publicRoute<B extends z.ZodType>(
  body: B,
  handler: (context: {
    body: z.infer<B>;
    params: Record<string, string>;
    services: Services;
  }) => Promise<Response>,
) {
  return (request: Request, route: { params: Promise<Record<string, string>> }): Promise<Response> =>
    answerPerson(request, async (services) => {
      checkOrigin(request, services.env.BELLKEEP_ORIGIN);
      await spend(`address ${clientAddress(services, request)}`);
      return await handler({
        body: await readJson(request, body, LARGEST_BODY_BYTES),
        params: await route.params,
        services,
      });
    });
}
