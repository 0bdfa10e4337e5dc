import { and, eq } from 'drizzle-orm';
import { account } from '@/db/schema';
import type { Tx } from '@/db/write';
import { newId } from '@/lib/platform/ids';

/** Make this hash the password of a person, in the caller's transaction. The row is as Better Auth reads it. */
export async function storePassword(tx: Tx, personId: string, hash: string, nowMs: number): Promise<void> {
  const updatedAt = new Date(nowMs);
  const changed = await tx
    .update(account)
    .set({ password: hash, updatedAt })
    .where(and(eq(account.userId, personId), eq(account.providerId, 'credential')))
    .returning({ id: account.id });
  if (changed.length > 0) return;
  await tx.insert(account).values({
    id: newId(),
    accountId: personId,
    providerId: 'credential',
    userId: personId,
    password: hash,
    createdAt: updatedAt,
    updatedAt,
  });
}
