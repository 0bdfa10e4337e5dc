import type { KeyIndex } from './keyIndex';

export interface ListQuery {
  prefix: string;
  /** Empty: no grouping. */
  delimiter: string;
  /** Only keys after this one; a common prefix that was the last entry of a page. */
  after: string;
  limit: number;
}

export interface Listed<T> {
  entries: ({ key: string; record: T } | { commonPrefix: string })[];
  truncated: boolean;
  /** The last entry: where the next page goes on. */
  last: string | undefined;
}

/** Keys in order, those that share a stretch up to the delimiter rolled into one common prefix. */
export function listKeys<T>(index: KeyIndex<T>, query: ListQuery): Listed<T> {
  const { prefix, delimiter, after, limit } = query;
  const entries: Listed<T>['entries'] = [];
  let last: string | undefined;
  let position = Math.max(index.lowerBound(prefix), after === '' ? 0 : index.upperBound(after));
  for (;;) {
    const key = index.keyAt(position);
    if (key === undefined || !key.startsWith(prefix)) return { entries, truncated: false, last };
    const cut = delimiter === '' ? -1 : key.indexOf(delimiter, prefix.length);
    const commonPrefix = cut < 0 ? undefined : key.slice(0, cut + delimiter.length);
    // A page that ended with a common prefix goes on behind all of it.
    if (commonPrefix !== undefined && commonPrefix === after) {
      position = index.endOfPrefix(position, commonPrefix);
      continue;
    }
    if (entries.length >= limit) return { entries, truncated: limit > 0, last };
    if (commonPrefix === undefined) {
      entries.push({ key, record: index.get(key) as T });
      last = key;
      position++;
    } else {
      entries.push({ commonPrefix });
      last = commonPrefix;
      position = index.endOfPrefix(position, commonPrefix);
    }
  }
}
