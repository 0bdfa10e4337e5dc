import type { ProblemCode } from '@/lib/contract/problems';

/**
 * A refusal that a person or a device is told about. The code is one of the catalogue; `detail` is a sentence
 * that says what happened, what was kept and what to do next; `extra` are members of the problem document
 * (RFC 9457, 3.2). `cause` is for the log and never leaves the house.
 */
export class Refusal extends Error {
  override readonly name = 'Refusal';
  constructor(
    readonly code: ProblemCode,
    detail?: string,
    readonly extra: Record<string, unknown> = {},
    options?: { cause?: unknown; headers?: Record<string, string> },
  ) {
    super(detail ?? code, options?.cause === undefined ? undefined : { cause: options.cause });
    this.detail = detail;
    this.headers = options?.headers ?? {};
  }
  readonly detail: string | undefined;
  readonly headers: Record<string, string>;
}
