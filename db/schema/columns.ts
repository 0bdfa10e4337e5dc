import { customType, integer, text } from 'drizzle-orm/sqlite-core';
import type { z } from 'zod';

/** UTC milliseconds. */
export const at = (name: string) => integer(name);

export const id = () => text('id').primaryKey();

/** A 32-byte hash as bytes. */
export const hash = customType<{ data: Uint8Array; driverData: ArrayBuffer | Uint8Array }>({
  dataType: () => 'blob',
  fromDriver: (value) => new Uint8Array(value instanceof ArrayBuffer ? value : new Uint8Array(value)),
});

/** JSON as text, checked by its schema whenever it is read: a row of another age never passes as today's. */
export function json<S extends z.ZodType>(name: string, schema: S) {
  return customType<{ data: z.infer<S>; driverData: string }>({
    dataType: () => 'text',
    toDriver: (value) => JSON.stringify(value),
    fromDriver: (value) => schema.parse(JSON.parse(value)) as z.infer<S>,
  })(name);
}
