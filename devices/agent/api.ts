import { NoAnswer, problemOf } from './answers';
import type { DeviceClock } from './clock';
import type { DeviceKeys } from './keys';
import { dpopProof } from './proofs';

export { ServiceProblem } from './answers';

export interface Credential {
  token: string;
  tokenType: 'DPoP' | 'Bearer';
}

export interface ApiOptions {
  origin: string;
  clock: DeviceClock;
  fetch?: typeof fetch;
  timeoutMs?: number;
}

interface Caller {
  keys: DeviceKeys;
  credential: Credential;
}

export interface ServiceApi {
  /** Call the service as this device. @throws ServiceProblem, NoAnswer */
  call<T>(path: string, body: unknown, as?: Caller): Promise<T>;
}

/** The device API over HTTP: signs each request, keeps the server's nonce, and repeats once when it needs a new one. */
export function createApi(options: ApiOptions): ServiceApi {
  const send = options.fetch ?? fetch;
  let nonce: string | null = null;

  async function headersFor(url: string, as?: Caller): Promise<Record<string, string>> {
    const headers: Record<string, string> = {
      'content-type': 'application/json',
      accept: 'application/json, application/problem+json',
    };
    if (!as) return headers;
    headers.authorization = `${as.credential.tokenType} ${as.credential.token}`;
    if (as.credential.tokenType === 'DPoP') {
      headers.dpop = await dpopProof(as.keys, {
        method: 'POST',
        url,
        token: as.credential.token,
        nonce,
        nowMs: options.clock.now(),
      });
    }
    return headers;
  }

  async function once(path: string, body: unknown, as?: Caller): Promise<Response> {
    const url = options.origin + path;
    const headers = await headersFor(url, as);
    let response: Response;
    try {
      response = await send(url, {
        method: 'POST',
        headers,
        body: JSON.stringify(body),
        // A credential is never carried to another address.
        redirect: 'manual',
        signal: AbortSignal.timeout(options.timeoutMs ?? 60_000),
      });
    } catch (cause) {
      throw new NoAnswer('no answer', { cause });
    }
    // Any answer may bring the next nonce (RFC 9449, 8.2).
    nonce = response.headers.get('dpop-nonce') ?? nonce;
    return response;
  }

  return {
    async call<T>(path: string, body: unknown, as?: Caller): Promise<T> {
      let response = await once(path, body, as);
      let failure = response.ok ? null : await problemOf(response);
      if (failure?.code === 'use-dpop-nonce') {
        response = await once(path, body, as);
        failure = response.ok ? null : await problemOf(response);
      }
      if (failure) throw failure;
      try {
        return (await response.json()) as T;
      } catch (cause) {
        throw new NoAnswer('the answer broke off', { cause });
      }
    },
  };
}
