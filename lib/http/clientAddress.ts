import { subscribe } from 'node:diagnostics_channel';
import type { IncomingMessage } from 'node:http';
import type { Services } from '@/lib/platform/services';

/**
 * Write the peer's address as the last entry of X-Forwarded-For before anything else sees a request: the framework
 * only fills the field when it is missing, so a caller could otherwise name any address it likes.
 */
export function recordPeerAddresses(): void {
  subscribe('http.server.request.start', (message) => {
    const { request } = message as { request: IncomingMessage };
    const before = request.headers['x-forwarded-for'];
    const peer = request.socket.remoteAddress ?? 'unknown';
    request.headers['x-forwarded-for'] =
      before === undefined ? peer : `${[before].flat().join(', ')}, ${peer}`;
  });
}

/**
 * The address a request came from: the entry that the outermost trusted proxy wrote, or the peer itself where no
 * proxy is trusted. What stands before it is the caller's own word.
 */
export function clientAddress(services: Pick<Services, 'env'>, request: Request): string {
  const entries = (request.headers.get('x-forwarded-for') ?? '')
    .split(',')
    .map((part) => part.trim())
    .filter(Boolean);
  return entries.at(-1 - services.env.TRUSTED_PROXIES) ?? entries[0] ?? 'unknown';
}
