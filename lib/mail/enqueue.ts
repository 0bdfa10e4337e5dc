import { outbox } from '@/db/schema';
import type { Tx } from '@/db/write';
import { newId } from '@/lib/platform/ids';
import type { Message } from './port';

/** Put a message in the outbox in the caller's transaction: it is sent if, and only if, that commits. */
export async function enqueueMail(tx: Tx, nowMs: number, message: Message): Promise<void> {
  await tx
    .insert(outbox)
    .values({ id: newId(), kind: 'mail', payload: { ...message }, createdAt: nowMs, dueAt: nowMs });
}
