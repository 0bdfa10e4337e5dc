import { and, eq, sql } from 'drizzle-orm';
import { custodySubject, deviceModel, encounter, filing, recording } from '@/db/schema';
import { findingSentence } from '@/lib/acoustics/sentences';
import type { Finding } from '@/lib/acoustics/types';
import type { CompleteAnswer } from '@/lib/contract/device';
import type { AuthenticatedDevice, DeviceModelRow } from '@/lib/keys/device';
import { shouldRenew } from '@/lib/keys/issueCredential';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { arrive } from './arrive';
import { limitsFor } from './limits';
import { measureRecording } from './measureRecording';
import { readArrived } from './readArrived';
import { sealRecording } from './sealRecording';
import type { IngestServices, RecordingRow } from './types';

/** Calls in this process that work on the same clip share one run; other processes are held apart by the stage. */
const running = new Map<string, Promise<void>>();

/**
 * Take a recording through the rest of its passage and answer with the verdict. It carries on from the last
 * committed step, whoever asks and however often: a clip that is measured already is only answered for.
 *
 * @throws Refusal `not-found`, `bytes-missing`, `bytes-mismatch`, `storage-unavailable`
 */
export async function completeRecording(
  services: IngestServices,
  caller: AuthenticatedDevice,
  number: string,
): Promise<CompleteAnswer> {
  const row = await findRecording(services, number);
  if (!row || row.deviceId !== caller.device.id) throw new Refusal('not-found');
  await carryOn(services, row.id);
  return await answerFor(services, caller, row.id);
}

/** The passage from wherever it stands to measured. The sweep calls it for clips whose device did not come back. */
export async function carryOn(services: IngestServices, recordingId: string): Promise<void> {
  const current = running.get(recordingId);
  if (current) return await current;
  const run = passage(services, recordingId).finally(() => running.delete(recordingId));
  running.set(recordingId, run);
  await run;
}

async function passage(services: IngestServices, recordingId: string): Promise<void> {
  let { row, model } = await load(services, recordingId);
  if (row.stopped !== null) throw new Refusal('bytes-mismatch', undefined, { recording: row.number });
  if (row.stage === 'measured' || row.stage === 'filed') return;
  const { limits, version } = await limitsFor(services, model);
  const request = { mediaType: row.mediaType, totalBytes: row.declaredBytes, limits };

  if (row.stage !== 'sealed') {
    const arrived = await arrive(services, row, request);
    await sealRecording(services, row, arrived.etag);
    await measureRecording(services, row, arrived.analysis, version);
    return;
  }
  // Sealed, and the process died before it was measured: the original is read again.
  ({ row, model } = await load(services, recordingId));
  const again = await readArrived(services.storage, services.analysis, row.originalKey ?? '', request);
  if (again.sha256 !== row.declaredSha256) throw new Error('the sealed original does not have its hash');
  await measureRecording(services, row, again.analysis, version);
}

async function findRecording(services: Pick<Services, 'read'>, number: string): Promise<RecordingRow | null> {
  const [row] = await services.read
    .select()
    .from(recording)
    .where(eq(recording.number, number.toUpperCase()))
    .limit(1);
  return row ?? null;
}

async function load(
  services: Pick<Services, 'read'>,
  id: string,
): Promise<{ row: RecordingRow; model: DeviceModelRow }> {
  const [found] = await services.read
    .select({ row: recording, model: deviceModel })
    .from(recording)
    .innerJoin(deviceModel, eq(deviceModel.id, recording.modelId))
    .where(eq(recording.id, id))
    .limit(1);
  if (!found) throw new Refusal('not-found');
  return found;
}

async function answerFor(
  services: IngestServices,
  caller: AuthenticatedDevice,
  id: string,
): Promise<CompleteAnswer> {
  const { row } = await load(services, id);
  const [place] = await services.read
    .select({ encounter: encounter.number, by: filing.by })
    .from(filing)
    .innerJoin(encounter, eq(encounter.id, filing.encounterId))
    .where(and(eq(filing.recordingId, id), sql`${filing.supersededAt} is null`))
    .limit(1);
  const [entries] = await services.read
    .select({ count: sql<number>`count(*)` })
    .from(custodySubject)
    .where(and(eq(custodySubject.subjectKind, 'recording'), eq(custodySubject.subjectId, id)));
  const findings = (row.findings ?? []) as unknown as Finding[];
  return {
    recording: row.number,
    stage: row.stage === 'filed' ? 'filed' : 'measured',
    verdict: row.verdict ?? 'repeat',
    reasons: findings.map((finding) => ({
      code: finding.code,
      severity: finding.severity,
      ...findingSentence(finding),
    })),
    sha256: row.declaredSha256,
    durationSeconds: row.durationSeconds,
    findings,
    measures: row.measures,
    filing: place ?? null,
    custodyEntries: entries?.count ?? 0,
    renew: shouldRenew(caller.credential, services.clock.now()),
  };
}
