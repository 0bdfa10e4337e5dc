import type { IncomingMessage, ServerResponse } from 'node:http';

const METHODS = 'GET, HEAD, PUT, POST, DELETE';
const EXPOSED = [
  'accept-ranges',
  'content-disposition',
  'content-length',
  'content-range',
  'content-type',
  'etag',
  'last-modified',
  'x-amz-checksum-sha256',
  'x-amz-request-id',
].join(', ');

/**
 * Headers that let a browser of an allowed origin read the answer (Fetch Standard, CORS protocol).
 *
 * @returns false where there is an origin and it is not allowed
 */
export function allowOrigin(
  message: IncomingMessage,
  response: ServerResponse,
  allowed: readonly string[],
): boolean {
  const { origin } = message.headers;
  if (origin === undefined) return true;
  const any = allowed.includes('*');
  if (!any && !allowed.includes(origin)) return false;
  response.setHeader('access-control-allow-origin', any ? '*' : origin);
  response.setHeader('access-control-expose-headers', EXPOSED);
  response.setHeader('vary', 'Origin, Access-Control-Request-Headers, Access-Control-Request-Method');
  return true;
}

/** Answer to a preflight. It is asked without credentials, so it is answered without. */
export function answerPreflight(message: IncomingMessage, response: ServerResponse, allowed: boolean): void {
  if (!allowed || message.headers['access-control-request-method'] === undefined) {
    response.writeHead(403, { 'content-length': 0 }).end();
    return;
  }
  response.setHeader('access-control-allow-methods', METHODS);
  response.setHeader(
    'access-control-allow-headers',
    message.headers['access-control-request-headers'] ?? '*',
  );
  response.setHeader('access-control-max-age', '600');
  response.writeHead(200, { 'content-length': 0 }).end();
}
