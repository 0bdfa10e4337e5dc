import { createHash } from 'node:crypto';
import { and, eq } from 'drizzle-orm';
import { derivedObject, recording } from '@/db/schema';
import { appendEntries } from '@/lib/custody/append';
import { type NewEntry, SERVICE_ACTOR } from '@/lib/custody/entry';
import { Refusal } from '@/lib/platform/errors';
import { StorageError } from '@/lib/storage/port';
import type { AnalysisResult } from './messages';
import type { IngestServices, Placed, RecordingRow } from './types';

/** What a clip is called that broke every decoder it was given to. */
const BEYOND_READING: AnalysisResult = {
  verdict: 'repeat',
  findings: [{ code: 'unreadable', severity: 'repeat' }],
  measures: null,
  facts: { failure: 'unreadable', reason: 'analysis-stopped' },
  metadata: null,
  peaks: null,
  spectrogram: null,
};

interface Picture {
  kind: 'peaks' | 'spectrogram';
  key: string;
  sha256: string;
  bytes: number;
}

/**
 * Sealed to measured, and to filed where something ties the clip to an encounter. Measures, verdict, pictures,
 * filing and their custody entries commit together.
 */
export async function measureRecording(
  services: IngestServices,
  row: Pick<RecordingRow, 'id' | 'slotKey'>,
  analysed: AnalysisResult | null,
  policyVersion: number,
): Promise<void> {
  const recordingId = row.id;
  const result = analysed ?? BEYOND_READING;
  const pictures = await storePictures(services, recordingId, result);
  // Died before the next line: the pictures lie under the names that the next call will use again.
  const now = services.clock.now();
  await services.write(async (tx) => {
    const [sealed] = await tx
      .select()
      .from(recording)
      .where(and(eq(recording.id, recordingId), eq(recording.stage, 'sealed')))
      .limit(1);
    if (!sealed) return;
    for (const picture of pictures) {
      await tx
        .insert(derivedObject)
        .values({ recordingId, ...picture, inputSha256: sealed.declaredSha256, madeAt: now })
        .onConflictDoUpdate({
          target: [derivedObject.recordingId, derivedObject.kind],
          set: { key: picture.key, sha256: picture.sha256, bytes: picture.bytes, madeAt: now },
        });
    }
    const place = await services.place(tx, sealed, now);
    await tx
      .update(recording)
      .set({
        stage: 'filed' in place ? 'filed' : 'measured',
        measuredAt: now,
        filedAt: 'filed' in place ? now : null,
        verdict: result.verdict,
        policyVersion,
        findings: result.findings as unknown as Record<string, unknown>[],
        measures: result.measures as unknown as Record<string, unknown> | null,
        facts: result.facts,
        metadata: result.metadata,
        durationSeconds: result.measures?.durationSeconds ?? null,
        sampleRateHz: result.measures?.sampleRateHz ?? null,
        noiseFloorDbfs: result.measures?.noiseFloorDbfsSine ?? null,
        activeLevelDbfs: result.measures?.activeLevelDbfsSine ?? null,
        dcFraction: result.measures?.dcFraction ?? null,
      })
      .where(eq(recording.id, recordingId));
    await appendEntries(tx, now, [
      measuredEntry(sealed, result, policyVersion, pictures),
      placedEntry(sealed, place),
    ]);
  });
  await services.storage.remove(row.slotKey).catch((error: unknown) => {
    // The slot's copy is only in the way; the sweep removes what stays.
    services.log.warn({ err: error }, 'an incoming copy was not removed');
  });
}

async function storePictures(
  services: IngestServices,
  recordingId: string,
  result: AnalysisResult,
): Promise<Picture[]> {
  const pictures: Picture[] = [];
  try {
    for (const kind of ['peaks', 'spectrogram'] as const) {
      const body = result[kind];
      if (!body) continue;
      const sha256 = createHash('sha256').update(body).digest('hex');
      const key = `derived/${recordingId}/${kind}-${sha256}`;
      await services.storage.put({ key, body, contentType: 'application/octet-stream' });
      pictures.push({ kind, key, sha256, bytes: body.byteLength });
    }
  } catch (error) {
    if (error instanceof StorageError)
      throw new Refusal(
        'storage-unavailable',
        undefined,
        {},
        { cause: error, headers: { 'retry-after': '2' } },
      );
    throw error;
  }
  return pictures;
}

const measuredEntry = (
  row: RecordingRow,
  result: AnalysisResult,
  policyVersion: number,
  pictures: Picture[],
): NewEntry => ({
  kind: 'measured',
  actor: SERVICE_ACTOR,
  subjects: [
    { kind: 'recording', id: row.id },
    { kind: 'device', id: row.deviceId },
  ],
  detail: {
    number: row.number,
    verdict: result.verdict,
    policy: policyVersion,
    findings: result.findings.map(({ code, severity, value }) => ({
      code,
      severity,
      ...(value === undefined ? {} : { value }),
    })),
    input: row.declaredSha256,
    derived: Object.fromEntries(pictures.map((picture) => [picture.kind, picture.sha256])),
  },
});

const placedEntry = (row: RecordingRow, place: { filed: Placed } | { tray: string }): NewEntry =>
  'filed' in place
    ? {
        kind: 'filed',
        actor: SERVICE_ACTOR,
        subjects: [
          { kind: 'recording', id: row.id },
          { kind: 'encounter', id: place.filed.encounterId },
          { kind: 'patient', id: place.filed.patientId },
          { kind: 'device', id: row.deviceId },
        ],
        detail: {
          number: row.number,
          encounter: place.filed.encounterNumber,
          by: place.filed.by,
          ...(place.filed.sessionNumber ? { session: place.filed.sessionNumber } : {}),
        },
      }
    : {
        kind: 'put-in-tray',
        actor: SERVICE_ACTOR,
        subjects: [
          { kind: 'recording', id: row.id },
          { kind: 'device', id: row.deviceId },
        ],
        detail: { number: row.number, why: place.tray },
      };
