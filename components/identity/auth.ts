'use client';

/** What the sign-in service answers, in words where it refuses. */
export type AuthAnswer =
  | { ok: true; data: Record<string, unknown> }
  | { ok: false; status: number; message: string };

/** Call one of the sign-in service's addresses. */
export async function authCall(path: string, body: Record<string, unknown>): Promise<AuthAnswer> {
  try {
    const response = await fetch(`/api/auth${path}`, {
      method: 'POST',
      headers: { 'content-type': 'application/json' },
      body: JSON.stringify(body),
    });
    const data = (await response.json().catch(() => ({}))) as Record<string, unknown>;
    if (response.ok) return { ok: true, data: data ?? {} };
    const words =
      typeof data.message === 'string'
        ? data.message
        : typeof data.detail === 'string'
          ? data.detail
          : 'That did not work. Try again in a moment.';
    return {
      ok: false,
      status: response.status,
      message:
        response.status === 429 && typeof data.message !== 'string'
          ? 'Too many tries. Wait a few minutes.'
          : words,
    };
  } catch {
    return { ok: false, status: 0, message: 'The server did not answer. Try again in a moment.' };
  }
}
