import { randomUUID } from 'node:crypto';
import { RateLimiterMemory, RateLimiterRes } from 'rate-limiter-flexible';
import type { z } from 'zod';
import { authenticateDevice } from '@/lib/credentials/authenticateDevice';
import { currentNonce } from '@/lib/credentials/nonce';
import type { AuthenticatedDevice } from '@/lib/keys/device';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { readJson } from './body';
import { clientAddress } from './clientAddress';
import { problemResponse } from './problem';
import { getServices } from './services';

interface Context<Body, Device> {
  body: Body;
  device: Device;
  params: Record<string, string>;
  services: Services;
  requestId: string;
}
type RouteContext = { params: Promise<Record<string, string>> };

const LARGEST_BODY_BYTES = 16_384;
const WRONG_CALLS_PER_MINUTE = 60;

const limiters = globalThis as {
  bellkeepDeviceLimits?: { calls: RateLimiterMemory; wrong: RateLimiterMemory };
};
function limits(services: Services) {
  limiters.bellkeepDeviceLimits ??= {
    calls: new RateLimiterMemory({ points: services.env.DEVICE_REQUESTS_PER_MINUTE, duration: 60 }),
    wrong: new RateLimiterMemory({ points: WRONG_CALLS_PER_MINUTE, duration: 60 }),
  };
  return limiters.bellkeepDeviceLimits;
}

async function spend(limiter: RateLimiterMemory, key: string): Promise<void> {
  try {
    await limiter.consume(key);
  } catch (left) {
    if (!(left instanceof RateLimiterRes)) throw left;
    const seconds = String(Math.max(1, Math.ceil(left.msBeforeNext / 1000)));
    throw new Refusal(
      'too-many-requests',
      undefined,
      {},
      { headers: { 'retry-after': seconds, ratelimit: `"device";r=0;t=${seconds}` } },
    );
  }
}

const CHALLENGED = new Set(['token-invalid', 'proof-invalid', 'renewal-needed']);
const NO_GUESS = new Set(['use-dpop-nonce', 'renewal-needed']);

async function answer(
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
    response.headers.set('cache-control', 'no-store');
    response.headers.set('dpop-nonce', currentNonce(services));
    services.log.info(
      {
        requestId,
        method: request.method,
        path,
        status: response.status,
        ms: Math.round(performance.now() - started),
      },
      'device call',
    );
    return response;
  } catch (error) {
    const refusal = error instanceof Refusal ? error : new Refusal('fault', undefined, {}, { cause: error });
    const level = refusal.code === 'fault' ? 'error' : 'info';
    services.log[level](
      { requestId, method: request.method, path, problem: refusal.code, err: refusal.cause },
      'device call refused',
    );
    return problemResponse(refusal.code, {
      detail: refusal.detail,
      extra: refusal.extra,
      requestId,
      origin: services.env.BELLKEEP_ORIGIN,
      headers: {
        'dpop-nonce': currentNonce(services),
        ...(CHALLENGED.has(refusal.code) ? { 'www-authenticate': 'DPoP algs="EdDSA ES256"' } : {}),
        ...refusal.headers,
      },
    });
  }
}

/**
 * A route of the device API: authenticates, parses, calls one verb, answers. Every answer carries a request id and a
 * nonce; every refusal is a problem of the catalogue.
 */
export function deviceRoute<S extends z.ZodType>(
  options: {
    body: S /** The call that renews: a token of a distrusted key is enough with a proof. */;
    renewing?: boolean;
  },
  handler: (context: Context<z.infer<S>, AuthenticatedDevice>) => Promise<Response>,
) {
  return (request: Request, route: RouteContext): Promise<Response> =>
    answer(request, async (services, requestId) => {
      const { calls, wrong } = limits(services);
      let device: AuthenticatedDevice;
      try {
        device = await authenticateDevice(
          services,
          request,
          services.env.BELLKEEP_ORIGIN + new URL(request.url).pathname,
          { renewing: options.renewing ?? false },
        );
      } catch (error) {
        // A device that needs a nonce, or must renew, is no guesser; everything else that fails here is counted by address.
        if (error instanceof Refusal && !NO_GUESS.has(error.code))
          await spend(wrong, clientAddress(services, request));
        throw error;
      }
      await spend(calls, device.device.id);
      const body = await readJson(request, options.body, LARGEST_BODY_BYTES);
      return await handler({ device, body, services, requestId, params: await route.params });
    });
}

/** A route of the device API that comes before any credential: enrolment. */
export function openDeviceRoute<S extends z.ZodType>(
  options: { body: S },
  handler: (context: Context<z.infer<S>, null>) => Promise<Response>,
) {
  return (request: Request, route: RouteContext): Promise<Response> =>
    answer(request, async (services, requestId) => {
      const { wrong } = limits(services);
      const address = clientAddress(services, request);
      const body = await readJson(request, options.body, LARGEST_BODY_BYTES);
      try {
        return await handler({ device: null, body, services, requestId, params: await route.params });
      } catch (error) {
        if (error instanceof Refusal) await spend(wrong, `enrol ${address}`);
        throw error;
      }
    });
}
