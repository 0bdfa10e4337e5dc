import { and, eq } from 'drizzle-orm';
import { recording } from '@/db/schema';
import { appendEntries } from '@/lib/custody/append';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import { Refusal } from '@/lib/platform/errors';
import { currentPolicy } from '@/lib/policy/currentPolicy';
import { StorageError } from '@/lib/storage/port';
import type { IngestServices, RecordingRow } from './types';

const YEAR_MS = 365.25 * 86_400_000;

/** Until when what is kept now is locked in storage, UTC ms: by policy, or by the environment until there is one. */
export async function retentionEnd(
  services: Pick<IngestServices, 'env' | 'read'>,
  now: number,
): Promise<number> {
  const { settings } = await currentPolicy(services.read, 'retention', services.env);
  return Math.floor(now + settings.originalYears * YEAR_MS);
}

/** Where an original lies for good: its hash is part of its name, so the name says what must be in it. */
export const originalKeyOf = (row: Pick<RecordingRow, 'id' | 'declaredSha256'>): string =>
  `originals/${row.id}/${row.declaredSha256}`;

/**
 * Received to sealed: the bytes that were hashed are copied to their final key, under a lock where the store has
 * one. The copy is conditional on the tag of the bytes that were read, so a device that puts other bytes through its
 * still valid address between reading and copying changes nothing; and no presigned address leads to the final key.
 *
 * @param etag the tag under which the bytes were read
 */
export async function sealRecording(
  services: IngestServices,
  row: RecordingRow,
  etag: string,
): Promise<void> {
  const now = services.clock.now();
  const key = originalKeyOf(row);
  const retainUntilMs = await retentionEnd(services, now);
  let lock: 'compliance' | 'none';
  try {
    const sealed = await services.storage.seal({
      from: row.slotKey,
      to: key,
      retainUntilMs,
      contentType: row.mediaType,
      expectedEtag: etag,
      contentLength: row.declaredBytes,
      sha256: Buffer.from(row.declaredSha256, 'hex'),
    });
    lock = sealed.lock;
  } catch (error) {
    // Other bytes under the final key are no outage: nobody but us writes there.
    if (error instanceof StorageError && error.code !== 'exists')
      throw new Refusal(
        'storage-unavailable',
        undefined,
        {},
        { cause: error, headers: { 'retry-after': '2' } },
      );
    throw error;
  }
  // Died before the next line: the sealed copy is there and the next call finds it, equal, and carries on.
  await services.write(async (tx) => {
    const [moved] = await tx
      .update(recording)
      .set({
        stage: 'sealed',
        sealedAt: now,
        originalKey: key,
        lockedUntil: lock === 'compliance' ? retainUntilMs : null,
        lockKind: lock,
      })
      .where(and(eq(recording.id, row.id), eq(recording.stage, 'received')))
      .returning({ id: recording.id });
    if (!moved) return;
    await appendEntries(tx, now, [
      {
        kind: 'sealed',
        actor: SERVICE_ACTOR,
        subjects: [
          { kind: 'recording', id: row.id },
          { kind: 'device', id: row.deviceId },
        ],
        detail: {
          number: row.number,
          sha256: row.declaredSha256,
          bytes: row.declaredBytes,
          key,
          lock,
          ...(lock === 'compliance' ? { lockedUntil: new Date(retainUntilMs).toISOString() } : {}),
        },
      },
    ]);
  });
}
