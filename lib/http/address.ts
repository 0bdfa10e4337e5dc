import type { z } from 'zod';

type Search = Record<string, string | string[] | undefined>;

/**
 * A page's filters out of its address. What is not understood there is passed over: an old bookmark still opens.
 *
 * @returns the filter, and the query string that asks the API for the same
 */
export function readSearch<S extends z.ZodObject>(
  schema: S,
  search: Search,
): { filter: z.infer<S>; query: string } {
  const known: Record<string, string> = {};
  for (const [name, field] of Object.entries(schema.shape)) {
    const value = [search[name]].flat()[0];
    if (value !== undefined && (field as z.ZodType).safeParse(value).success) known[name] = value;
  }
  const query = new URLSearchParams(known).toString();
  return { filter: schema.parse(known) as z.infer<S>, query: query ? `?${query}` : '' };
}
