import type { ProblemDocument } from '@/lib/contract/problems';
import type { DeviceClock } from './clock';
import type { DeviceKeys } from './keys';
import { dpopProof } from './proofs';

/** A refusal of the service, as its problem document says. */
export class ServiceProblem extends Error {
  constructor(
    readonly status: number,
    readonly problem: ProblemDocument,
    readonly retryAfterMs: number | null,
  ) {
    super(problem.title);
  }
  get code(): string {
    return this.problem.type.split('/').at(-1) ?? '';
  }
}

/** No answer: the line broke, or the time was over. The call may have happened all the same. */
export class NoAnswer extends Error {}

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

export interface ServiceApi {
  /** Call the service as this device. @throws ServiceProblem, NoAnswer */
  call<T>(path: string, body: unknown, as?: { keys: DeviceKeys; credential: Credential }): Promise<T>;
}

/** The device API over HTTP: signs each request, keeps the server's nonce, and repeats once when it needs a new one. */
export function createApi(options: ApiOptions): ServiceApi {
  const send = options.fetch ?? fetch;
  let nonce: string | null = null;

  async function once(
    path: string,
    body: unknown,
    as?: { keys: DeviceKeys; credential: Credential },
  ): Promise<Response> {
    const url = options.origin + path;
    const headers: Record<string, string> = {
      'content-type': 'application/json',
      accept: 'application/json',
    };
    if (as) {
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
    }
    let response: Response;
    try {
      response = await send(url, {
        method: 'POST',
        headers,
        body: JSON.stringify(body),
        signal: AbortSignal.timeout(options.timeoutMs ?? 60_000),
      });
    } catch (cause) {
      throw new NoAnswer('no answer', { cause });
    }
    nonce = response.headers.get('dpop-nonce') ?? nonce;
    return response;
  }

  return {
    async call<T>(
      path: string,
      body: unknown,
      as?: { keys: DeviceKeys; credential: Credential },
    ): Promise<T> {
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

async function problemOf(response: Response): Promise<ServiceProblem> {
  const text = await response.text().catch(() => '');
  let document: ProblemDocument;
  try {
    document = JSON.parse(text) as ProblemDocument;
    if (typeof document.type !== 'string') throw new SyntaxError('no problem document');
  } catch {
    document = { type: 'about:blank', title: `HTTP ${response.status}`, status: response.status };
  }
  const after = Number(response.headers.get('retry-after'));
  return new ServiceProblem(
    response.status,
    document,
    Number.isFinite(after) && after > 0 ? after * 1000 : null,
  );
}
