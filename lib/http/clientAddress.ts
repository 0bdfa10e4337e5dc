import type { Services } from '@/lib/platform/services';

/**
 * The address a request came from. X-Forwarded-For is believed only as far as there are trusted proxies: the entry
 * that the outermost of them wrote. Without one the framework's own value stands.
 */
export function clientAddress(services: Pick<Services, 'env'>, request: Request): string {
  const forwarded = (request.headers.get('x-forwarded-for') ?? '').split(',').map((part) => part.trim()).filter(Boolean);
  const proxies = services.env.TRUSTED_PROXIES;
  // Next's own server appends the peer as the last entry.
  return forwarded.at(-1 - proxies) ?? forwarded[0] ?? 'unknown';
}
