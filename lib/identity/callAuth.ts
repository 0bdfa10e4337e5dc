import type { Services } from '@/lib/platform/services';
import { authOf, PEER_FIELD } from './auth';

/** Whoever sends a request, as far as sign-in asks: from where, and with which cookies. */
export interface Peer {
  address: string;
  headers: Headers;
}

export interface AuthAnswer {
  status: number;
  /** What Better Auth says. It holds the session's token and never leaves the house as it is. */
  body: Record<string, unknown>;
  /** Set-Cookie lines. */
  cookies: string[];
  retryAfterSeconds: number | null;
}

/**
 * Post to one of Better Auth's endpoints through its own handler, so that its limits hold. The caller has checked the
 * request's origin. Never call it inside a `write`: Better Auth writes by the same queue and would wait for itself.
 *
 * @param options.cookies which of the peer's cookies go along, by the end of their name; null: none; all unless told
 */
export async function callAuth(
  services: Pick<Services, 'database' | 'read' | 'env' | 'log'>,
  peer: Peer,
  path: string,
  body: Record<string, unknown>,
  options: { cookies?: string | null } = {},
): Promise<AuthAnswer> {
  const { BELLKEEP_ORIGIN: origin } = services.env;
  const headers = new Headers({
    'content-type': 'application/json',
    origin,
    [PEER_FIELD]: peer.address,
    'user-agent': peer.headers.get('user-agent') ?? '',
  });
  const cookies = (peer.headers.get('cookie') ?? '')
    .split(/;\s*/)
    .filter((pair) => options.cookies === undefined || goesAlong(pair, options.cookies));
  if (cookies.length > 0) headers.set('cookie', cookies.join('; '));
  const response = await authOf(services).handler(
    new Request(`${origin}/api/auth${path}`, { method: 'POST', headers, body: JSON.stringify(body) }),
  );
  const retry = Number(response.headers.get('retry-after') ?? response.headers.get('x-retry-after'));
  return {
    status: response.status,
    body: ((await response.json().catch(() => null)) as Record<string, unknown> | null) ?? {},
    cookies: response.headers.getSetCookie(),
    retryAfterSeconds: Number.isFinite(retry) && retry > 0 ? retry : null,
  };
}

const goesAlong = (pair: string, nameEnd: string | null): boolean =>
  nameEnd !== null && pair.slice(0, pair.indexOf('=')).endsWith(nameEnd);

/** Value of a signed cookie without its signature; the signature is checked where it counts, by Better Auth. */
export function cookieValue(headers: Headers, nameEnd: string): string | null {
  for (const pair of (headers.get('cookie') ?? '').split(/;\s*/)) {
    const at = pair.indexOf('=');
    if (at < 0 || !pair.slice(0, at).endsWith(nameEnd)) continue;
    try {
      const value = decodeURIComponent(pair.slice(at + 1));
      return value.slice(0, value.lastIndexOf('.')) || null;
    } catch {
      return null;
    }
  }
  return null;
}

/** The token of the session that these Set-Cookie lines begin. */
export function sessionToken(cookies: string[]): string {
  for (const line of cookies) {
    const [, value] = /\.session_token=([^;]+)/.exec(line) ?? [];
    if (value) return decodeURIComponent(value).split('.')[0] ?? '';
  }
  return '';
}
