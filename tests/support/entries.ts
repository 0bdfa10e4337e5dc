import { asc } from 'drizzle-orm';
import { custodyEntry } from '@/db/schema';
import type { Entry } from '@/lib/custody/entry';
import type { House } from './services';

/** The custody log, oldest first, as it is hashed. */
export async function entriesOf(house: Pick<House, 'services'>): Promise<Entry[]> {
  const rows = await house.services.read.select().from(custodyEntry).orderBy(asc(custodyEntry.sequence));
  return rows.map((row) => JSON.parse(row.canonical) as Entry);
}

export const kindsOf = async (house: Pick<House, 'services'>): Promise<string[]> =>
  (await entriesOf(house)).map((entry) => entry.kind);
