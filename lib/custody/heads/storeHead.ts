import { and, desc, eq, isNull, lt, lte } from 'drizzle-orm';
import { z } from 'zod';
import { outbox, policyVersion } from '@/db/schema';
import type { Services } from '@/lib/platform/services';
import { hex } from '../pure/hash';
import { readHead } from '../pure/head';
import { type HeadRow, headOf, STORE_HEAD } from './makeHead';

export const HEADS_PREFIX = 'custody/heads/';
const LARGEST_NOTE_BYTES = 10_000;
const YEAR_MS = 365.25 * 86_400_000;

/** Sorted by size; the root is part of the name, so that two heads of one size are both kept, and both found. */
export const headKey = (head: { size: number; root: Uint8Array }): string =>
  `${sizeKey(head.size)}-${hex(head.root)}`;
const sizeKey = (size: number): string => `${HEADS_PREFIX}${String(size).padStart(16, '0')}`;

/** A head outlives what it proves, the originals sealed that day, by a year; by policy or setting, whichever is longer. */
async function lockedUntil(
  services: Pick<Services, 'env' | 'read'>,
  head: Pick<HeadRow, 'madeAt'>,
): Promise<number> {
  const [policy] = await services.read
    .select({ settings: policyVersion.settings })
    .from(policyVersion)
    .where(and(eq(policyVersion.kind, 'retention'), lte(policyVersion.madeAt, head.madeAt)))
    .orderBy(desc(policyVersion.version))
    .limit(1);
  const decided = policy?.settings.originalYears;
  const years = Math.max(services.env.RETENTION_YEARS, typeof decided === 'number' ? decided : 0);
  return Math.floor(head.madeAt + (years + 1) * YEAR_MS);
}

const Payload = z.object({ size: z.number().int() });

/**
 * Keep a head as a locked object. Work of the outbox: it may run twice and by several processes, and what is there
 * already is only made sure of.
 *
 * @throws Error where other bytes lie under the head's own name
 */
export async function storeHead(
  services: Pick<Services, 'read' | 'storage' | 'env' | 'log'>,
  payload: Record<string, unknown>,
): Promise<void> {
  const { size } = Payload.parse(payload);
  const head = await headOf(services, size);
  if (!head) throw new Error(`there is no head of ${size} entries`);
  const key = headKey(head);
  const body = Buffer.from(head.note, 'utf8');
  const retainUntilMs = await lockedUntil(services, head);
  const { outcome, lock } = await services.storage.put({
    key,
    body,
    contentType: 'text/plain; charset=utf-8',
    ifAbsent: true,
    retainUntilMs,
  });
  if (outcome === 'exists') {
    const kept = await services.storage.getBytes(key, LARGEST_NOTE_BYTES);
    if (!body.equals(kept)) throw new Error(`other bytes lie under ${key}`);
    // Died between putting and locking on a store that does both apart.
    const found = await services.storage.head(key);
    if ((found?.retainUntilMs ?? 0) < Math.floor(retainUntilMs / 1000) * 1000)
      await services.storage.setRetention(key, retainUntilMs);
  } else if (lock === 'none') services.log.warn({ size }, 'a tree head is kept without a lock');
  await sayIfBehind(services, head);
}

const REVIVED_AFTER_MS = 3_600_000;

/** Heads that the outbox set aside while storage was away for long are tried again, until they lie there. */
export async function reviveHeads(services: Pick<Services, 'write' | 'clock'>): Promise<void> {
  const now = services.clock.now();
  await services.write(async (tx) => {
    await tx
      .update(outbox)
      .set({ deadAt: null, tries: 0, dueAt: now })
      .where(
        and(eq(outbox.kind, STORE_HEAD), isNull(outbox.doneAt), lt(outbox.deadAt, now - REVIVED_AFTER_MS)),
      );
  });
}

/** A head of a larger tree, or another of this size, lies in storage: this database is an older copy of itself. */
async function sayIfBehind(services: Pick<Services, 'storage' | 'log'>, head: HeadRow): Promise<void> {
  const { entries } = await services.storage.list(HEADS_PREFIX, { after: sizeKey(head.size), limit: 2 });
  const ahead = entries.find(({ key }) => key !== headKey(head));
  if (ahead)
    services.log.error(
      { size: head.size, ahead: ahead.key },
      'storage holds a tree head that this log does not reach: run the custody audit',
    );
}

/** A head as it lies in storage, by its name. */
export async function lockedHead(
  services: Pick<Services, 'storage'>,
  head: { size: number; root: Uint8Array },
): Promise<{ note: string; retainUntilMs: number | null } | null> {
  const key = headKey(head);
  const found = await services.storage.head(key);
  if (!found) return null;
  const note = Buffer.from(await services.storage.getBytes(key, LARGEST_NOTE_BYTES)).toString('utf8');
  return { note, retainUntilMs: found.retainUntilMs ?? null };
}

/** Every head in storage, by size, a page at a time. What is no head there comes with `head` null. */
export async function* storedHeads(services: Pick<Services, 'storage'>) {
  let after: string | undefined;
  do {
    const page = await services.storage.list(HEADS_PREFIX, after === undefined ? {} : { after });
    for (const { key } of page.entries) {
      const note = Buffer.from(await services.storage.getBytes(key, LARGEST_NOTE_BYTES)).toString('utf8');
      let head: ReturnType<typeof readHead> | null = null;
      try {
        head = readHead(note);
      } catch {
        // Named by whoever asks: what lies there is no head any more.
      }
      yield { key, note, head };
    }
    after = page.next;
  } while (after !== undefined);
}
