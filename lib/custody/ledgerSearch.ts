import { z } from 'zod';
import { ENTRY_KINDS } from './entry';
import type { LedgerQuery } from './readThread';

const first = (value: unknown): unknown => (Array.isArray(value) ? value[0] : value);

/** The ledger's search as it stands in the address; what is not understood there is passed over. */
export const LedgerSearch = z.object({
  q: z.preprocess(first, z.string().trim().max(100).catch('')).default(''),
  kind: z.preprocess(first, z.enum(ENTRY_KINDS).optional().catch(undefined)),
  /** `today`, `yesterday` or YYYY-MM-DD, in the hospital's zone. */
  day: z.preprocess(
    first,
    z
      .union([z.enum(['today', 'yesterday']), z.iso.date()])
      .optional()
      .catch(undefined),
  ),
  before: z.preprocess(first, z.coerce.number().int().min(0).optional().catch(undefined)),
});
export type LedgerSearch = z.infer<typeof LedgerSearch>;

const DAY_MS = 86_400_000;

/** Minutes east of UTC of a zone at a moment. */
function offsetMinutes(at: number, zone: string): number {
  const name =
    new Intl.DateTimeFormat('en-US', { timeZone: zone, timeZoneName: 'longOffset' })
      .formatToParts(at)
      .find((part) => part.type === 'timeZoneName')?.value ?? 'GMT';
  const match = /([+-])(\d\d):(\d\d)/.exec(name);
  return match ? (match[1] === '-' ? -1 : 1) * (Number(match[2]) * 60 + Number(match[3])) : 0;
}

/** First millisecond of a local day (YYYY-MM-DD) of a zone. */
export function startOfDay(date: string, zone: string): number {
  const utc = Date.parse(`${date}T00:00:00Z`);
  const guess = utc - offsetMinutes(utc, zone) * 60_000;
  // The offset may differ at the day's own start (a night on which clocks change).
  return utc - offsetMinutes(guess, zone) * 60_000;
}

const localDate = (at: number, zone: string): string =>
  new Intl.DateTimeFormat('en-CA', { timeZone: zone, dateStyle: 'short' }).format(at);

/** The search as a query of the log. */
export function ledgerQuery(search: LedgerSearch, zone: string, nowMs: number): LedgerQuery {
  const query: LedgerQuery = { before: search.before, kinds: search.kind ? [search.kind] : undefined };
  if (search.day === undefined) return query;
  const date =
    search.day === 'today'
      ? localDate(nowMs, zone)
      : search.day === 'yesterday'
        ? localDate(nowMs - DAY_MS, zone)
        : search.day;
  const fromMs = startOfDay(date, zone);
  return { ...query, fromMs, toMs: startOfDay(localDate(fromMs + 1.5 * DAY_MS, zone), zone) };
}
