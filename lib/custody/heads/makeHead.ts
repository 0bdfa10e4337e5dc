import { desc, eq } from 'drizzle-orm';
import { custodyHead, outbox } from '@/db/schema';
import { newId } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';
import { hex, sameBytes } from '../pure/hash';
import { headText } from '../pure/head';
import { signatureLine } from '../pure/note';
import { logSize } from '../readThread';
import { rootAt } from '../tree/prove';

export type HeadRow = typeof custodyHead.$inferSelect;

/** Whoever signs heads; the key itself stays with the keeper of keys. */
export interface HeadSigner {
  kid: string;
  /** 32 bytes. */
  publicKey: Uint8Array;
  /** @returns 64 bytes (RFC 8032, 5.1.6) */
  sign(message: Uint8Array): Promise<Uint8Array>;
}

/** The log is not what the last head says it was: nothing is signed over it. */
export class LogForked extends Error {
  override readonly name = 'LogForked';
}

/** Outbox work that puts a head under lock in storage. */
export const STORE_HEAD = 'custody-head';

export async function lastHead(services: Pick<Services, 'read'>): Promise<HeadRow | null> {
  const [row] = await services.read.select().from(custodyHead).orderBy(desc(custodyHead.size)).limit(1);
  return row ?? null;
}

export async function headOf(services: Pick<Services, 'read'>, size: number): Promise<HeadRow | null> {
  const [row] = await services.read.select().from(custodyHead).where(eq(custodyHead.size, size)).limit(1);
  return row ?? null;
}

/**
 * Sign the tree as it stands, if something was appended since the last head. Several processes may do it at once: the
 * first one's head of a size is the head of that size, and the others make none.
 *
 * @returns the new head, or null
 * @throws LogForked where the tree does not hold the last head's tree any more
 */
export async function makeHead(
  services: Pick<Services, 'read' | 'write' | 'clock' | 'env'>,
  signer: HeadSigner,
): Promise<HeadRow | null> {
  const last = await lastHead(services);
  const size = await logSize(services);
  if (last !== null) await checkFollows(services, last, size);
  if (size <= (last?.size ?? 0)) return null;
  const root = await rootAt(services.read, size);
  const origin = services.env.BELLKEEP_CUSTODY_ORIGIN;
  const text = headText(origin, size, root);
  const signature = await signer.sign(new TextEncoder().encode(text));
  const note = `${text}\n${await signatureLine(origin, signer.publicKey, signature)}`;
  const row: HeadRow = { size, root, note, kid: signer.kid, madeAt: services.clock.now() };
  // Durable with the commit: the head and the work that keeps it in storage. Died before: the next minute signs anew.
  return await services.write(async (tx) => {
    const [newest] = await tx
      .select({ size: custodyHead.size })
      .from(custodyHead)
      .orderBy(desc(custodyHead.size))
      .limit(1);
    if (newest && newest.size >= size) return null;
    await tx.insert(custodyHead).values(row);
    await tx.insert(outbox).values({
      id: newId(),
      kind: STORE_HEAD,
      payload: { size },
      createdAt: row.madeAt,
      dueAt: row.madeAt,
    });
    return row;
  });
}

async function checkFollows(services: Pick<Services, 'read'>, last: HeadRow, size: number): Promise<void> {
  if (size < last.size)
    throw new LogForked(`the log holds ${size} entries, the last head was of ${last.size}`);
  const root = await rootAt(services.read, last.size);
  if (!sameBytes(root, last.root))
    throw new LogForked(
      `the tree of ${last.size} has the root ${hex(root)}, its head says ${hex(last.root)}`,
    );
}
