import { and, desc, eq, gte, inArray, isNull, lte, or, type SQL, sql } from 'drizzle-orm';
import { z } from 'zod';
import {
  custodySubject,
  derivedObject,
  device,
  deviceModel,
  encounter,
  filing,
  listeningSession,
  patient,
  recording,
  user,
  ward,
} from '@/db/schema';
import type { Authorized } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';
import { type Candidate, candidatesFor } from './candidates';
import { inTrayOf } from './readEncounters';

export interface ClipLine {
  id: string;
  number: string;
  assetTag: string;
  site: string | null;
  recordedAt: number;
  receivedAt: number | null;
  durationSeconds: number | null;
  stage: 'awaited' | 'received' | 'sealed' | 'measured' | 'filed';
  stopped: string | null;
  verdict: 'usable' | 'care' | 'repeat' | null;
  findings: Record<string, unknown>[] | null;
  cleanStretch: { from: number; to: number } | null;
  keptAt: number | null;
  keptReason: string | null;
}

const columns = {
  id: recording.id,
  number: recording.number,
  assetTag: device.assetTag,
  site: recording.site,
  recordedAt: recording.recordedAt,
  receivedAt: recording.receivedAt,
  durationSeconds: recording.durationSeconds,
  stage: recording.stage,
  stopped: recording.stopped,
  verdict: recording.verdict,
  findings: recording.findings,
  measures: recording.measures,
  keptAt: recording.keptAt,
  keptReason: recording.keptReason,
};

type Row = Omit<ClipLine, 'cleanStretch'> & { measures: Record<string, unknown> | null };
const lineOf = ({ measures, ...row }: Row): ClipLine => ({
  ...row,
  cleanStretch: (measures?.cleanStretch as ClipLine['cleanStretch']) ?? null,
});

/** Clips now filed to an encounter, newest first. */
export async function clipsOfEncounter(
  services: Pick<Services, 'read'>,
  encounterId: string,
): Promise<ClipLine[]> {
  const rows = await services.read
    .select(columns)
    .from(filing)
    .innerJoin(recording, eq(recording.id, filing.recordingId))
    .innerJoin(device, eq(device.id, recording.deviceId))
    .where(and(eq(filing.encounterId, encounterId), isNull(filing.supersededAt)))
    .orderBy(desc(recording.recordedAt))
    .limit(200);
  return rows.map(lineOf);
}

export interface SessionView {
  id: string;
  number: string;
  openedAt: number;
  closedAt: number | null;
  encounterId: string;
  encounterNumber: string;
  patientId: string;
  familyName: string;
  givenName: string;
  birthDate: string | null;
  recordNumber: string;
  assetTag: string;
  model: string;
  deviceId: string;
  lastCheckAt: number | null;
  checkDueAt: number | null;
  clips: ClipLine[];
}

/** A listening session with the clips of its window: those it filed, and those still on their way from its device. */
export async function readSession(services: Pick<Services, 'read'>, id: string): Promise<SessionView | null> {
  const [row] = await services.read
    .select({ session: listeningSession, encounter, patient, device, model: deviceModel.name })
    .from(listeningSession)
    .innerJoin(encounter, eq(encounter.id, listeningSession.encounterId))
    .innerJoin(patient, eq(patient.id, encounter.patientId))
    .innerJoin(device, eq(device.id, listeningSession.deviceId))
    .innerJoin(deviceModel, eq(deviceModel.id, device.modelId))
    .where(eq(listeningSession.id, id))
    .limit(1);
  if (!row) return null;
  const { session } = row;
  const clips = await services.read
    .select(columns)
    .from(recording)
    .innerJoin(device, eq(device.id, recording.deviceId))
    .leftJoin(filing, and(eq(filing.recordingId, recording.id), isNull(filing.supersededAt)))
    .where(
      and(
        eq(recording.deviceId, session.deviceId),
        or(
          and(eq(filing.sessionId, session.id), eq(filing.encounterId, session.encounterId)),
          // Not filed yet, and of this window: what is on its way is shown as such.
          and(
            isNull(filing.id),
            gte(recording.recordedAt, session.openedAt - 5_000),
            session.closedAt === null ? undefined : lte(recording.recordedAt, session.closedAt),
          ),
        ),
      ),
    )
    .orderBy(desc(recording.recordedAt), desc(recording.awaitedAt))
    .limit(200);
  return {
    id: session.id,
    number: session.number,
    openedAt: session.openedAt,
    closedAt: session.closedAt,
    encounterId: row.encounter.id,
    encounterNumber: row.encounter.number,
    patientId: row.patient.id,
    familyName: row.patient.familyName,
    givenName: row.patient.givenName,
    birthDate: row.patient.birthDate,
    recordNumber: row.patient.recordNumber,
    assetTag: row.device.assetTag,
    model: row.model,
    deviceId: row.device.id,
    lastCheckAt: row.device.lastCheckAt,
    checkDueAt: row.device.checkDueAt,
    clips: clips.map(lineOf),
  };
}

export interface TrayLine extends ClipLine {
  ward: string | null;
  scannedIdentifier: string | null;
  why: string;
  candidates: Candidate[];
}

/** Clips that nothing ties to an encounter yet, oldest last, each with why and where it may belong. */
export async function readTray(
  services: Pick<Services, 'read'>,
  by: Authorized<'bedside.read'>,
  before: number | undefined,
  limit = 20,
): Promise<{ rows: TrayLine[]; next: number | null }> {
  const rows = await services.read
    .select({
      ...columns,
      ward: ward.name,
      scannedIdentifier: recording.scannedIdentifier,
      measuredAt: recording.measuredAt,
    })
    .from(recording)
    .innerJoin(device, eq(device.id, recording.deviceId))
    .leftJoin(ward, eq(ward.id, device.wardId))
    .where(
      and(
        inTrayOf([...by.wardIds]),
        before === undefined ? undefined : sql`${recording.measuredAt} < ${before}`,
      ),
    )
    .orderBy(desc(recording.measuredAt))
    .limit(limit + 1);
  const page = rows.slice(0, limit);
  const lines = await Promise.all(
    page.map(async ({ measuredAt: _at, ward: wardName, scannedIdentifier, ...row }) => ({
      ...lineOf(row),
      ward: wardName,
      scannedIdentifier,
      why:
        scannedIdentifier === null
          ? 'no listening session was open on the device, and nothing was scanned'
          : `“${scannedIdentifier}” was scanned, and does not lead to one running encounter`,
      candidates: await candidatesFor(services, row.id, by.wardIds),
    })),
  );
  return { rows: lines, next: rows.length > limit ? (page.at(-1)?.measuredAt ?? null) : null };
}

export const ClipFilter = z.strictObject({
  verdict: z.enum(['usable', 'care', 'repeat']).optional(),
  device: z.string().max(64).optional(),
  q: z.string().trim().max(64).default(''),
  before: z.string().max(80).optional(),
  limit: z.coerce.number().int().min(1).max(200).default(50),
});
export type ClipFilter = z.infer<typeof ClipFilter>;

export interface FiledLine extends ClipLine {
  encounterId: string;
  encounterNumber: string;
  patientName: string;
  recordNumber: string;
}

/** Clips filed to encounters on the person's wards, newest first, a page at a time. */
export async function listClips(
  services: Pick<Services, 'read'>,
  by: Authorized<'bedside.read'>,
  filter: ClipFilter,
): Promise<{ rows: FiledLine[]; next: string | null }> {
  if (by.wardIds.length === 0) return { rows: [], next: null };
  const pattern = `${filter.q.replace(/[\\%_]/g, (c) => `\\${c}`)}%`;
  const [at, id] = (filter.before ?? '').split(' ');
  const where: (SQL | undefined)[] = [
    inArray(encounter.wardId, [...by.wardIds]),
    filter.verdict ? eq(recording.verdict, filter.verdict) : undefined,
    filter.device ? eq(device.assetTag, filter.device) : undefined,
    filter.q === ''
      ? undefined
      : sql`(${recording.number} like ${pattern} escape '\\' or ${patient.recordNumber} like ${pattern} escape '\\' or ${patient.familyName} like ${pattern} escape '\\')`,
    id === undefined ? undefined : sql`(${recording.recordedAt}, ${recording.id}) < (${Number(at)}, ${id})`,
  ];
  const rows = await services.read
    .select({
      ...columns,
      encounterId: encounter.id,
      encounterNumber: encounter.number,
      patientName: sql<string>`${patient.givenName} || ' ' || ${patient.familyName}`,
      recordNumber: patient.recordNumber,
    })
    .from(recording)
    .innerJoin(device, eq(device.id, recording.deviceId))
    .innerJoin(filing, and(eq(filing.recordingId, recording.id), isNull(filing.supersededAt)))
    .innerJoin(encounter, eq(encounter.id, filing.encounterId))
    .innerJoin(patient, eq(patient.id, encounter.patientId))
    .where(and(...where))
    .orderBy(desc(recording.recordedAt), desc(recording.id))
    .limit(filter.limit + 1);
  const page = rows.slice(0, filter.limit);
  const last = page.at(-1);
  return {
    rows: page.map(({ encounterId, encounterNumber, patientName, recordNumber, ...row }) => ({
      ...lineOf(row),
      encounterId,
      encounterNumber,
      patientName,
      recordNumber,
    })),
    next: rows.length > filter.limit && last ? `${last.recordedAt} ${last.id}` : null,
  };
}

/** One recording with everything its page shows; null when there is none. Who may see it is the caller's question. */
export async function readClip(services: Pick<Services, 'read'>, number: string) {
  const [row] = await services.read
    .select({
      recording,
      device,
      model: deviceModel,
      filing,
      encounter,
      patient,
      filedBy: user.name,
      session: listeningSession.number,
      wardName: ward.name,
    })
    .from(recording)
    .innerJoin(device, eq(device.id, recording.deviceId))
    .innerJoin(deviceModel, eq(deviceModel.id, recording.modelId))
    .leftJoin(filing, and(eq(filing.recordingId, recording.id), isNull(filing.supersededAt)))
    .leftJoin(encounter, eq(encounter.id, filing.encounterId))
    .leftJoin(patient, eq(patient.id, filing.patientId))
    .leftJoin(user, eq(user.id, filing.personId))
    .leftJoin(listeningSession, eq(listeningSession.id, filing.sessionId))
    .leftJoin(ward, eq(ward.id, encounter.wardId))
    .where(eq(recording.number, number.toUpperCase()))
    .limit(1);
  if (!row) return null;
  const [derived, entries] = await Promise.all([
    services.read.select().from(derivedObject).where(eq(derivedObject.recordingId, row.recording.id)),
    services.read
      .select({ n: sql<number>`count(*)` })
      .from(custodySubject)
      .where(
        and(eq(custodySubject.subjectKind, 'recording'), eq(custodySubject.subjectId, row.recording.id)),
      ),
  ]);
  return { ...row, derived, entries: entries[0]?.n ?? 0 };
}
export type ClipView = NonNullable<Awaited<ReturnType<typeof readClip>>>;
