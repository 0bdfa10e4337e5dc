import type { z } from 'zod';
import type { ProblemDocument } from '@/lib/contract/problems';

/** A refusal of the service, as its problem document says (RFC 9457). */
export class ServiceProblem extends Error {
  constructor(
    readonly status: number,
    readonly problem: ProblemDocument,
    readonly retryAfterMs: number | null,
  ) {
    super(problem.title);
  }
  /** The stable code: the last part of the problem's type. */
  get code(): string {
    return this.problem.type.split('/').at(-1) ?? '';
  }
  /** What to tell the hospital's IT; it finds the call in the service's log. */
  get requestId(): string | null {
    return this.problem.requestId ?? null;
  }
}

/**
 * No answer, or none that can be read: the line broke, or the time was over. The call may have happened all the same,
 * which is why every call of a device may be repeated.
 */
export class NoAnswer extends Error {
  readonly retryAfterMs: number | null;
  constructor(message: string, options: { cause?: unknown; retryAfterMs?: number | null } = {}) {
    super(message, { cause: options.cause });
    this.retryAfterMs = options.retryAfterMs ?? null;
  }
}

const DAY_MS = 86_400_000;

/**
 * Retry-After in milliseconds (RFC 9110, 10.2.3): seconds, or a date, which is held against the answer's own Date,
 * because the device's clock may be years off. At most a day: a longer timer would be none.
 */
export function retryAfterOf(headers: Headers): number | null {
  const said = headers.get('retry-after')?.trim();
  if (!said) return null;
  const until = Date.parse(said) - Date.parse(headers.get('date') ?? '');
  const milliseconds = /^\d+$/.test(said) ? Number(said) * 1000 : until;
  return Number.isFinite(milliseconds) ? Math.min(DAY_MS, Math.max(0, milliseconds)) : null;
}

/** The problem in an answer that is not a success; a body that is no problem document is named by its status. */
export async function problemOf(response: Response): Promise<ServiceProblem> {
  const text = await response.text().catch(() => '');
  let document: ProblemDocument;
  try {
    document = JSON.parse(text) as ProblemDocument;
    if (typeof document?.type !== 'string' || typeof document.title !== 'string')
      throw new SyntaxError('no problem document');
  } catch {
    document = { type: 'about:blank', title: `HTTP ${response.status}`, status: response.status };
  }
  const requestId = document.requestId ?? response.headers.get('x-request-id') ?? undefined;
  return new ServiceProblem(
    response.status,
    { ...document, ...(requestId === undefined ? {} : { requestId }) },
    retryAfterOf(response.headers),
  );
}

/** What an answer says, by the contract. @throws NoAnswer when something else spoke, such as a captive portal */
export function understood<S extends z.ZodType>(schema: S, answer: unknown): z.infer<S> {
  const read = schema.safeParse(answer);
  if (!read.success) throw new NoAnswer('the answer is not one of the service', { cause: read.error });
  return read.data;
}
