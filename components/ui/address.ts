type Search = URLSearchParams | Record<string, string | string[] | undefined>;

const parameters = (search: Search): URLSearchParams => {
  if (search instanceof URLSearchParams) return new URLSearchParams(search);
  const made = new URLSearchParams();
  for (const [name, value] of Object.entries(search))
    for (const one of [value ?? []].flat()) made.append(name, one);
  return made;
};

/**
 * The same page with some parameters changed; null or an empty value takes one away. Takes what a page gets as
 * `searchParams` (awaited) as well as what `useSearchParams` gives.
 */
export function hrefWith(pathname: string, search: Search, changes: Record<string, string | null>): string {
  const next = parameters(search);
  for (const [name, value] of Object.entries(changes)) {
    if (value === null || value === '') next.delete(name);
    else next.set(name, value);
  }
  const query = next.toString();
  return query ? `${pathname}?${query}` : pathname;
}
