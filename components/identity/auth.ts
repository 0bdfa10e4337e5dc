'use client';

/** What sign-in answers, in words where it refuses. */
export type AuthAnswer =
  | { ok: true; data: Record<string, unknown> }
  | { ok: false; status: number; message: string; members: Record<string, unknown> };

/** Call one of the addresses that anybody may call: sign-in, new password, invitation. */
export async function authCall(path: string, body: Record<string, unknown>): Promise<AuthAnswer> {
  try {
    const response = await fetch(`/api${path}`, {
      method: 'POST',
      headers: { 'content-type': 'application/json' },
      body: JSON.stringify(body),
    });
    const data = (await response.json().catch(() => ({}))) as Record<string, unknown>;
    if (response.ok) return { ok: true, data };
    const [first] = Array.isArray(data.errors) ? (data.errors as { path?: string; message?: string }[]) : [];
    const words = [first?.message, data.detail, 'That did not work. Try again in a moment.'];
    return {
      ok: false,
      status: response.status,
      message: words.find((one): one is string => typeof one === 'string') ?? '',
      members: data,
    };
  } catch {
    return {
      ok: false,
      status: 0,
      message: 'The server did not answer. Try again in a moment.',
      members: {},
    };
  }
}
