import { and, eq, isNull } from 'drizzle-orm';
import { device, recording } from '@/db/schema';
import { appendEntries } from '@/lib/custody/append';
import { deviceActor } from '@/lib/keys/device';
import { Refusal } from '@/lib/platform/errors';
import { StorageError } from '@/lib/storage/port';
import type { AnalysisRequest } from './messages';
import { type Arrived, readArrived } from './readArrived';
import { retentionEnd } from './sealRecording';
import type { IngestServices, RecordingRow } from './types';

/**
 * Awaited to received: read what was put, check that it is what was announced, and write so.
 *
 * Bytes that are not the announced ones are kept in quarantine storage with a custody entry and never enter the
 * record. A call that finds the clip received already reads the bytes again: nothing but the row says that it was
 * right, and the seal must be made of bytes that were seen.
 *
 * @throws Refusal `bytes-missing`, `bytes-mismatch`, `storage-unavailable`
 */
export async function arrive(
  services: IngestServices,
  row: RecordingRow,
  request: AnalysisRequest,
): Promise<Arrived> {
  let arrived: Arrived;
  try {
    arrived = await readArrived(services.storage, services.analysis, row.slotKey, request);
  } catch (error) {
    if (!(error instanceof StorageError)) throw error;
    if (error.code === 'not-found') throw new Refusal('bytes-missing', undefined, { recording: row.number });
    throw new Refusal(
      'storage-unavailable',
      undefined,
      {},
      { cause: error, headers: { 'retry-after': '2' } },
    );
  }
  if (arrived.bytes !== row.declaredBytes || arrived.sha256 !== row.declaredSha256) {
    await quarantine(services, row, arrived);
    throw new Refusal('bytes-mismatch', undefined, { recording: row.number });
  }
  const now = services.clock.now();
  await services.write(async (tx) => {
    const [moved] = await tx
      .update(recording)
      .set({ stage: 'received', receivedAt: now })
      .where(and(eq(recording.id, row.id), eq(recording.stage, 'awaited'), isNull(recording.stopped)))
      .returning({ id: recording.id });
    if (!moved) return;
    const [sender] = await tx.select().from(device).where(eq(device.id, row.deviceId)).limit(1);
    await appendEntries(tx, now, [
      {
        kind: 'received',
        actor: deviceActor(sender ?? { id: row.deviceId, assetTag: row.deviceId }),
        subjects: [
          { kind: 'recording', id: row.id },
          { kind: 'device', id: row.deviceId },
        ],
        detail: {
          number: row.number,
          sha256: arrived.sha256,
          bytes: arrived.bytes,
          thumbprint: sender?.keyThumbprint ?? null,
          clockOffsetMs: row.clockOffsetMs,
        },
      },
    ]);
  });
  return arrived;
}

async function quarantine(services: IngestServices, row: RecordingRow, arrived: Arrived): Promise<void> {
  const key = `quarantine/${row.id}/${arrived.sha256}`;
  await services.storage.seal({
    from: row.slotKey,
    to: key,
    retainUntilMs: await retentionEnd(services, services.clock.now()),
    contentType: 'application/octet-stream',
    expectedEtag: arrived.etag,
    contentLength: arrived.bytes,
    sha256: Buffer.from(arrived.sha256, 'hex'),
  });
  const now = services.clock.now();
  // If the process dies before this line the copy lies unnamed in quarantine, and the next call makes it again.
  await services.write(async (tx) => {
    const [stopped] = await tx
      .update(recording)
      .set({ stopped: 'bytes-mismatch' })
      .where(and(eq(recording.id, row.id), eq(recording.stage, 'awaited')))
      .returning({ id: recording.id });
    if (!stopped) return;
    await appendEntries(tx, now, [
      {
        kind: 'bytes-quarantined',
        actor: { kind: 'service', id: 'bellkeep', label: 'Bellkeep' },
        subjects: [
          { kind: 'recording', id: row.id },
          { kind: 'device', id: row.deviceId },
        ],
        detail: {
          number: row.number,
          why: 'bytes-mismatch',
          announced: { sha256: row.declaredSha256, bytes: row.declaredBytes },
          arrived: { sha256: arrived.sha256, bytes: arrived.bytes },
          key,
        },
      },
    ]);
  });
}
