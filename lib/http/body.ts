import type { z } from 'zod';
import { Refusal } from '@/lib/platform/errors';

/**
 * Read a JSON body of bounded size, strictly.
 *
 * @throws Refusal `media-type-unsupported`, `body-too-large`, `body-invalid` with `errors: [{ path, message }]`
 */
export async function readJson<S extends z.ZodType>(
  request: Request,
  schema: S,
  largestBytes: number,
): Promise<z.infer<S>> {
  const type = request.headers.get('content-type') ?? '';
  if (!/^application\/(?:[\w.-]+\+)?json\s*(?:;|$)/i.test(type)) throw new Refusal('media-type-unsupported');
  const text = await readBounded(request, largestBytes);
  let value: unknown;
  try {
    value = JSON.parse(text);
  } catch {
    throw new Refusal('body-invalid', 'The body is not JSON.', {
      errors: [{ path: '', message: 'not JSON' }],
    });
  }
  const parsed = schema.safeParse(value);
  if (parsed.success) return parsed.data;
  const errors = parsed.error.issues
    .slice(0, 50)
    .map((issue) => ({ path: issue.path.join('.'), message: issue.message }));
  throw new Refusal(
    'body-invalid',
    `${errors.length === 1 ? 'One field is' : `${errors.length} fields are`} not right.`,
    { errors },
  );
}

async function readBounded(request: Request, largestBytes: number): Promise<string> {
  const reader = request.body?.getReader();
  if (!reader) return '';
  const chunks: Uint8Array[] = [];
  let total = 0;
  for (;;) {
    const { done, value } = await reader.read();
    if (done) break;
    total += value.byteLength;
    if (total > largestBytes) {
      await reader.cancel();
      throw new Refusal('body-too-large');
    }
    chunks.push(value);
  }
  try {
    return new TextDecoder('utf-8', { fatal: true }).decode(Buffer.concat(chunks));
  } catch {
    throw new Refusal('body-invalid', 'The body is not UTF-8.', {
      errors: [{ path: '', message: 'not UTF-8' }],
    });
  }
}
