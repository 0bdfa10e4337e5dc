import { and, asc, desc, eq, gte, lt } from 'drizzle-orm';
import {
  custodyEntry,
  custodyHead,
  custodySubject,
  derivedObject,
  device,
  deviceModel,
  recording,
  signingKey,
} from '@/db/schema';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { type HeadKey, headKeys } from '../heads/headKeys';
import { type HeadRow, type HeadSigner, lastHead, makeHead } from '../heads/makeHead';
import { type ConsistencyProof, consistencyProof, type InclusionProof, inclusionProofs } from '../tree/prove';

/** Why and by whom a package is made. */
export interface Making {
  madeAt: string;
  madeBy: string;
  reason: string;
}

/** Everything a package holds of a recording, as of one tree head. */
export interface Evidence {
  number: string;
  origin: string;
  original: { key: string; sha256: string; bytes: number; mediaType: string; sealedSequence: number };
  derived: { kind: string; key: string; sha256: string; bytes: number }[];
  /** The recording's thread and its device's enrolment, in order. */
  entries: { sequence: number; canonical: string }[];
  proofs: InclusionProof[];
  /** The smallest first; the last is the one that the proofs lead to. */
  heads: HeadRow[];
  consistency: ConsistencyProof[];
  treeKeys: HeadKey[];
  /** Public halves of the keys that device tokens are signed with (RFC 7517). */
  tokenKeys: unknown[];
  device: DeviceRecord;
}

export interface DeviceRecord {
  assetTag: string;
  serialNumber: string;
  maker: string;
  model: string;
  udi: string | null;
  lot: string | null;
  /** As the recording was made. */
  firmware: string | null;
  /** Entry of the enrolment that was in force; null where the log holds none before the recording. */
  enrolmentSequence: number | null;
  /** RFC 7638 thumbprint of the key it enrolled with. */
  thumbprint: string | null;
  /** The key itself, where it is still that one. */
  publicJwk: Record<string, unknown> | null;
}

type Needs = Pick<Services, 'read' | 'write' | 'clock' | 'env'>;

/**
 * Gather a recording's evidence. A head is made first where entries are newer than the last one, so that every entry of
 * the thread is proven.
 *
 * @throws Refusal `not-found` for no such recording, `not-possible` where it is not sealed
 */
export async function gatherEvidence(services: Needs, signer: HeadSigner, number: string): Promise<Evidence> {
  await makeHead(services, signer);
  const newest = await lastHead(services);
  const [found] = await services.read
    .select({ recording, device, model: deviceModel })
    .from(recording)
    .innerJoin(device, eq(device.id, recording.deviceId))
    .innerJoin(deviceModel, eq(deviceModel.id, recording.modelId))
    .where(eq(recording.number, number.toUpperCase()))
    .limit(1);
  if (!found) throw new Refusal('not-found');
  const thread = newest ? await threadOf(services, found.recording.id, newest.size) : [];
  const sealed = thread.find(({ kind }) => kind === 'sealed');
  if (!newest || !sealed || found.recording.originalKey === null)
    throw new Refusal('not-possible', 'The recording is not sealed: there is nothing to prove yet.');
  const enrolment = await enrolmentOf(services, found.device.id, thread[0]?.sequence ?? 0);
  const entries = [...(enrolment ? [enrolment] : []), ...thread].sort((a, b) => a.sequence - b.sequence);
  const heads = await headsFor(services, sealed.sequence, newest);
  return {
    number: found.recording.number,
    origin: services.env.BELLKEEP_CUSTODY_ORIGIN,
    original: {
      key: found.recording.originalKey,
      sha256: found.recording.declaredSha256,
      bytes: found.recording.declaredBytes,
      mediaType: found.recording.mediaType,
      sealedSequence: sealed.sequence,
    },
    derived: await services.read
      .select({
        kind: derivedObject.kind,
        key: derivedObject.key,
        sha256: derivedObject.sha256,
        bytes: derivedObject.bytes,
      })
      .from(derivedObject)
      .where(eq(derivedObject.recordingId, found.recording.id))
      .orderBy(asc(derivedObject.kind)),
    entries: entries.map(({ sequence, canonical }) => ({ sequence, canonical })),
    proofs: await inclusionProofs(
      services.read,
      entries.map(({ sequence }) => sequence),
      newest.size,
    ),
    heads,
    consistency: await Promise.all(
      heads
        .slice(1)
        .map((head, i) => consistencyProof(services.read, heads[i]?.size ?? head.size, head.size)),
    ),
    treeKeys: (await headKeys(services)).filter(({ compromisedAt }) => compromisedAt === null),
    tokenKeys: await tokenKeysOf(services),
    device: deviceRecord(found, enrolment),
  };
}

async function threadOf(services: Needs, recordingId: string, size: number) {
  return await services.read
    .select({ sequence: custodyEntry.sequence, kind: custodyEntry.kind, canonical: custodyEntry.canonical })
    .from(custodySubject)
    .innerJoin(custodyEntry, eq(custodyEntry.sequence, custodySubject.sequence))
    .where(
      and(
        eq(custodySubject.subjectKind, 'recording'),
        eq(custodySubject.subjectId, recordingId),
        lt(custodySubject.sequence, size),
      ),
    )
    .orderBy(asc(custodySubject.sequence));
}

async function enrolmentOf(services: Needs, deviceId: string, before: number) {
  const [row] = await services.read
    .select({ sequence: custodyEntry.sequence, canonical: custodyEntry.canonical })
    .from(custodySubject)
    .innerJoin(custodyEntry, eq(custodyEntry.sequence, custodySubject.sequence))
    .where(
      and(
        eq(custodySubject.subjectKind, 'device'),
        eq(custodySubject.subjectId, deviceId),
        eq(custodyEntry.kind, 'device-enrolled'),
        lt(custodySubject.sequence, before),
      ),
    )
    .orderBy(desc(custodySubject.sequence))
    .limit(1);
  return row ?? null;
}

/** The first head that holds the sealing, so that it is dated by what was signed then, and the newest. */
async function headsFor(services: Needs, sealed: number, newest: HeadRow): Promise<HeadRow[]> {
  const [first] = await services.read
    .select()
    .from(custodyHead)
    .where(gte(custodyHead.size, sealed + 1))
    .orderBy(asc(custodyHead.size))
    .limit(1);
  return first && first.size < newest.size ? [first, newest] : [newest];
}

async function tokenKeysOf(services: Needs): Promise<unknown[]> {
  const rows = await services.read
    .select({ publicJwk: signingKey.publicJwk })
    .from(signingKey)
    .where(eq(signingKey.use, 'device-token'))
    .orderBy(asc(signingKey.createdAt));
  return rows.map(({ publicJwk }) => JSON.parse(publicJwk) as unknown);
}

function deviceRecord(
  found: {
    recording: typeof recording.$inferSelect;
    device: typeof device.$inferSelect;
    model: typeof deviceModel.$inferSelect;
  },
  enrolment: { sequence: number; canonical: string } | null,
): DeviceRecord {
  const said = enrolment
    ? (JSON.parse(enrolment.canonical) as { detail?: { thumbprint?: unknown } }).detail?.thumbprint
    : null;
  const thumbprint = typeof said === 'string' ? said : null;
  return {
    assetTag: found.device.assetTag,
    serialNumber: found.device.serialNumber,
    maker: found.model.maker,
    model: found.model.name,
    udi: found.device.udi,
    lot: found.device.lot,
    firmware: found.recording.firmware,
    enrolmentSequence: enrolment?.sequence ?? null,
    thumbprint,
    publicJwk: found.device.keyThumbprint === thumbprint ? (found.device.publicJwk ?? null) : null,
  };
}
