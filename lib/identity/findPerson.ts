import { and, eq, isNull } from 'drizzle-orm';
import { user } from '@/db/schema';
import type { Tx } from '@/db/write';
import { Refusal } from '@/lib/platform/errors';

/** Somebody who is here, in the caller's transaction. @throws Refusal `not-found` for strangers and people who left */
export async function findPerson(tx: Tx, id: string): Promise<typeof user.$inferSelect> {
  const [person] = await tx
    .select()
    .from(user)
    .where(and(eq(user.id, id), isNull(user.leftAt)))
    .limit(1);
  if (!person) throw new Refusal('not-found');
  return person;
}
