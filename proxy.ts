import { type NextRequest, NextResponse } from 'next/server';

/** Where browsers put and get recordings: presigned addresses of the store. */
const storeOrigin = (): string => {
  const endpoint = process.env.S3_PUBLIC_ENDPOINT || process.env.S3_ENDPOINT;
  return endpoint ? new URL(endpoint).origin : '';
};

/**
 * Security fields of pages. Scripts run only with this answer's nonce (CSP level 3); styles may be inline, because the
 * component library sets them on elements; nothing is embedded and nobody embeds us.
 */
export function proxy(request: NextRequest): NextResponse {
  const nonce = Buffer.from(crypto.getRandomValues(new Uint8Array(16))).toString('base64');
  const development = process.env.NODE_ENV === 'development' ? " 'unsafe-eval'" : '';
  const policy = [
    "default-src 'none'",
    `script-src 'self' 'nonce-${nonce}' 'strict-dynamic'${development}`,
    "style-src 'self' 'unsafe-inline'",
    "img-src 'self' data: blob:",
    "font-src 'self'",
    "media-src 'self' blob:",
    `connect-src 'self' ${storeOrigin()}`.trim(),
    "manifest-src 'self'",
    "worker-src 'self'",
    "form-action 'self'",
    "base-uri 'none'",
    "frame-ancestors 'none'",
  ].join('; ');
  const headers = new Headers(request.headers);
  headers.set('x-nonce', nonce);
  headers.set('content-security-policy', policy);
  headers.set('x-bellkeep-path', request.nextUrl.pathname + request.nextUrl.search);
  const response = NextResponse.next({ request: { headers } });
  response.headers.set('content-security-policy', policy);
  response.headers.set('x-content-type-options', 'nosniff');
  response.headers.set('referrer-policy', 'no-referrer');
  response.headers.set('permissions-policy', 'camera=(), microphone=(), geolocation=(), payment=(), usb=()');
  response.headers.set('cross-origin-opener-policy', 'same-origin');
  if ((process.env.BELLKEEP_ORIGIN ?? '').startsWith('https:'))
    response.headers.set('strict-transport-security', 'max-age=31536000; includeSubDomains');
  return response;
}

// Pages only: a route that this matches has its request body cut at 10 MB.
export const config = { matcher: ['/((?!api/|_next/static|_next/image|icon.svg|\\.well-known/).*)'] };
