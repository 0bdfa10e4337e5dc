import { findingsOf } from '@/lib/filing/clipLine';
import type { ClipView } from '@/lib/filing/readRecordings';

/** A recording as pages and routes show it: no keys of storage, no hashes of requests. */
export function recordingView(clip: ClipView) {
  const { recording: r, device, model, encounter, patient, filing } = clip;
  return {
    id: r.id,
    number: r.number,
    stage: r.stage,
    stopped: r.stopped,
    verdict: r.verdict,
    policyVersion: r.policyVersion,
    site: r.site,
    chestpieceSide: r.chestpieceSide,
    gainStep: r.gainStep,
    filter: r.filter,
    firmware: r.firmware,
    mediaType: r.mediaType,
    recordedAt: r.recordedAt,
    clockOffsetMs: r.clockOffsetMs,
    awaitedAt: r.awaitedAt,
    receivedAt: r.receivedAt,
    sealedAt: r.sealedAt,
    measuredAt: r.measuredAt,
    filedAt: r.filedAt,
    lockedUntil: r.lockedUntil,
    lockKind: r.lockKind,
    sha256: r.declaredSha256,
    bytes: r.declaredBytes,
    durationSeconds: r.durationSeconds,
    sampleRateHz: r.sampleRateHz,
    findings: findingsOf(r.findings),
    measures: r.measures,
    keptAt: r.keptAt,
    keptReason: r.keptReason,
    version: r.version,
    device: {
      id: device.id,
      assetTag: device.assetTag,
      model: model.name,
      expectedSampleRatesHz: model.sampleRatesHz,
    },
    filing:
      filing && encounter
        ? {
            by: filing.by,
            at: filing.filedAt,
            encounterId: encounter.id,
            encounterNumber: encounter.number,
            person: clip.filedBy,
            session: clip.session,
            reason: filing.reason,
            ward: clip.wardName,
            bed: encounter.bed,
          }
        : null,
    patient: patient
      ? {
          id: patient.id,
          givenName: patient.givenName,
          familyName: patient.familyName,
          birthDate: patient.birthDate,
          recordNumber: patient.recordNumber,
        }
      : null,
    pictures: clip.derived.map((picture) => ({ kind: picture.kind, sha256: picture.sha256 })),
    entries: clip.entries,
  };
}
export type RecordingView = ReturnType<typeof recordingView>;
