import { ORIGIN } from './services';

export type Handler = (
  request: Request,
  // Next resolves to nothing where the address has no parameters; types of routes that read them leave that out.
  route: { params: Promise<Record<string, string>> },
) => Promise<Response>;

export interface Call {
  method?: 'GET' | 'POST';
  path?: string;
  params?: Record<string, string>;
  body?: unknown;
  cookie?: string;
  headers?: Record<string, string>;
  /** The address it comes from. */
  from?: string;
}

/** Call a route as a page of ours would: JSON, our own Origin, a peer address. */
export async function call(handler: Handler, wanted: Call = {}): Promise<Response> {
  const method = wanted.method ?? (wanted.body === undefined ? 'GET' : 'POST');
  const headers = new Headers({ 'x-forwarded-for': wanted.from ?? '192.0.2.7' });
  if (method !== 'GET') headers.set('origin', ORIGIN);
  if (wanted.body !== undefined) headers.set('content-type', 'application/json');
  if (wanted.cookie) headers.set('cookie', wanted.cookie);
  for (const [name, value] of Object.entries(wanted.headers ?? {})) {
    if (value === '') headers.delete(name);
    else headers.set(name, value);
  }
  const request = new Request(`${ORIGIN}${wanted.path ?? '/api/test'}`, {
    method,
    headers,
    ...(wanted.body === undefined
      ? {}
      : { body: typeof wanted.body === 'string' ? wanted.body : JSON.stringify(wanted.body) }),
  });
  return await handler(request, {
    params: Promise.resolve(wanted.params as Record<string, string>),
  });
}

/** A problem's code: the last part of its type. */
export async function problemOf(
  response: Response,
): Promise<{ code: string; body: Record<string, unknown> }> {
  const body = (await response.json()) as Record<string, unknown>;
  return { code: String(body.type).split('/').at(-1) ?? '', body };
}

/** What a browser's cookie jar sends after these answers. */
export function cookiesAfter(...answers: Response[]): string {
  const jar = new Map<string, string>();
  for (const answer of answers) {
    for (const line of answer.headers.getSetCookie()) {
      const [pair = '', ...attributes] = line.split(';');
      const at = pair.indexOf('=');
      const gone = attributes.some((attribute) => /^\s*max-age=0$/i.test(attribute));
      if (gone) jar.delete(pair.slice(0, at));
      else jar.set(pair.slice(0, at), pair.slice(at + 1));
    }
  }
  return [...jar].map(([name, value]) => `${name}=${value}`).join('; ');
}
