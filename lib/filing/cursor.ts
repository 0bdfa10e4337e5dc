import { z } from 'zod';

/**
 * Where a page of a list ended, as it stands in an address: opaque to whoever carries it. What is not one of ours is
 * refused by the schema and never reaches a query.
 */
export const cursor = <S extends z.ZodType>(shape: S) =>
  z
    .string()
    .max(1_000)
    .transform((text, context): z.infer<S> => {
      const parsed = shape.safeParse(unpacked(text));
      if (parsed.success) return parsed.data as z.infer<S>;
      context.addIssue({ code: 'custom', message: 'not a place in this list' });
      return z.NEVER;
    });

export const packed = (value: unknown): string => Buffer.from(JSON.stringify(value)).toString('base64url');

function unpacked(text: string): unknown {
  try {
    return JSON.parse(Buffer.from(text, 'base64url').toString('utf8'));
  } catch {
    return undefined;
  }
}
