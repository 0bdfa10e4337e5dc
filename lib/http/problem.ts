import { PROBLEMS, type ProblemCode, type ProblemDocument } from '@/lib/contract/problems';

export interface ProblemOptions {
  detail?: string | undefined;
  extra?: Record<string, unknown>;
  headers?: Record<string, string>;
  requestId: string;
  origin: string;
  instance?: string;
}

/** The document of a problem (RFC 9457, 3.1), its `type` a working page of this service. */
export function problemDocument(code: ProblemCode, options: ProblemOptions): ProblemDocument {
  const kind = PROBLEMS[code];
  return {
    ...options.extra,
    type: `${options.origin}/problems/${code}`,
    title: kind.title,
    status: kind.status,
    detail: options.detail ?? `${kind.keeps} ${kind.next}`,
    keeps: kind.keeps,
    next: kind.next,
    ...(options.instance ? { instance: options.instance } : {}),
    requestId: options.requestId,
  };
}

export function problemResponse(code: ProblemCode, options: ProblemOptions): Response {
  return new Response(JSON.stringify(problemDocument(code, options)), {
    status: PROBLEMS[code].status,
    headers: {
      'content-type': 'application/problem+json',
      'cache-control': 'no-store',
      'x-request-id': options.requestId,
      ...options.headers,
    },
  });
}
