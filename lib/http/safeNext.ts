/**
 * Where to go after sign-in: an address of this house, or the front door. Read as a browser reads it, which passes over
 * tabs and line ends and takes a backslash for a slash (WHATWG URL, 4.4).
 *
 * @returns path with query and fragment
 */
export function safeNext(value: string | string[] | undefined, origin: string): string {
  if (typeof value !== 'string' || !value.startsWith('/')) return '/';
  const target = URL.canParse(value, origin) ? new URL(value, origin) : null;
  if (target?.origin !== origin) return '/';
  return target.pathname.startsWith('//') ? '/' : target.pathname + target.search + target.hash;
}
