'use client';

import useSWR, { type SWRConfiguration } from 'swr';
import { type LiveEvent, useLive } from './LiveEvents';

/** A refusal as a person reads it: title, sentence, and the problem's code for pages that react to it. */
export class ProblemError extends Error {
  constructor(
    readonly status: number,
    readonly code: string,
    readonly title: string,
    detail: string,
    readonly members: Record<string, unknown>,
  ) {
    super(detail);
  }
}

async function failureOf(response: Response): Promise<ProblemError> {
  const members = (await response.json().catch(() => ({}))) as Record<string, unknown>;
  const text = (name: string) => (typeof members[name] === 'string' ? (members[name] as string) : undefined);
  return new ProblemError(
    response.status,
    text('type')?.split('/').at(-1) ?? 'fault',
    text('title') ?? 'Something went wrong',
    text('detail') ?? `The server answered ${response.status}. Try again in a moment.`,
    members,
  );
}

/** @throws ProblemError */
export async function getJson<T>(url: string): Promise<T> {
  const response = await fetch(url, { headers: { accept: 'application/json' } });
  if (!response.ok) throw await failureOf(response);
  return (await response.json()) as T;
}

/**
 * Send a change. `key` makes a repeat of the same act harmless: give the same one when the same form is sent again.
 *
 * @throws ProblemError
 */
export async function sendJson<T>(
  url: string,
  body: unknown,
  key: string,
  method: 'POST' | 'PUT' | 'PATCH' | 'DELETE' = 'POST',
): Promise<T> {
  const response = await fetch(url, {
    method,
    headers: { 'content-type': 'application/json', accept: 'application/json', 'idempotency-key': key },
    body: JSON.stringify(body),
  });
  if (!response.ok) throw await failureOf(response);
  return (response.status === 204 ? undefined : await response.json()) as T;
}

/**
 * What a route answers, kept fresh: the server's first drawing as `first`, asked again when a live event matches.
 */
export function useData<T>(
  url: string | null,
  first: T | undefined,
  live?: (event: LiveEvent) => boolean,
  options?: SWRConfiguration<T>,
) {
  const answer = useSWR<T, Error>(url, getJson<T>, {
    fallbackData: first,
    keepPreviousData: true,
    revalidateOnMount: first === undefined,
    revalidateOnFocus: true,
    ...options,
  });
  useLive(live ?? (() => false), () => void answer.mutate());
  return answer;
}
