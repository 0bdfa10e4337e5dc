import { createHash } from 'node:crypto';
import { and, asc, desc, eq, gt, inArray, isNotNull, notExists } from 'drizzle-orm';
import { z } from 'zod';
import { custodyEntry, custodySubject, derivedObject, recording } from '@/db/schema';
import type { Services } from '@/lib/platform/services';
import { StorageError } from '@/lib/storage/port';
import type { Entry } from '../entry';
import type { Report } from './findings';

const PAGE = 200;
type Needs = Pick<Services, 'read' | 'storage' | 'clock'>;
type RecordingRow = typeof recording.$inferSelect;

const Sealed = z.object({
  sha256: z.string(),
  bytes: z.number(),
  key: z.string(),
  lock: z.enum(['compliance', 'none']),
  lockedUntil: z.string().optional(),
});
const Measured = z.object({
  verdict: z.string(),
  derived: z.record(z.string(), z.string()).default({}),
});

/** What the log itself says that a recording's bytes, pictures and verdict are. */
interface Said {
  sealed: { sequence: number; detail: z.infer<typeof Sealed> } | null;
  measured: { sequence: number; detail: z.infer<typeof Measured> } | null;
}

export interface ObjectCounts {
  originals: number;
  /** Originals that their entries call locked. */
  lockedOriginals: number;
  derived: number;
}

/**
 * Hold every sealed recording's objects in storage against what its entries say: presence, bytes and lock. The rows of
 * recordings and pictures are held against the entries too, because pages are drawn from the rows.
 *
 * @param withBytes false looks at presence, length and lock only
 */
export async function auditObjects(
  services: Needs,
  report: Report,
  withBytes: boolean,
): Promise<ObjectCounts> {
  const counts: ObjectCounts = { originals: 0, lockedOriginals: 0, derived: 0 };
  let after = '';
  for (;;) {
    const rows = await services.read
      .select()
      .from(recording)
      .where(and(isNotNull(recording.sealedAt), gt(recording.id, after)))
      .orderBy(asc(recording.id))
      .limit(PAGE);
    for (const row of rows) {
      after = row.id;
      const said = await saidOf(services, row.id);
      if (said.sealed) {
        counts.originals++;
        if (said.sealed.detail.lock === 'compliance') counts.lockedOriginals++;
        await auditOriginal(services, report, row, said.sealed, withBytes);
      }
      if (said.measured)
        counts.derived += await auditDerived(services, report, row, said.measured, withBytes);
    }
    if (rows.length < PAGE) break;
  }
  await auditUnspoken(services, report);
  return counts;
}

async function saidOf(services: Needs, recordingId: string): Promise<Said> {
  const rows = await services.read
    .select({ sequence: custodyEntry.sequence, canonical: custodyEntry.canonical })
    .from(custodySubject)
    .innerJoin(custodyEntry, eq(custodyEntry.sequence, custodySubject.sequence))
    .where(
      and(
        eq(custodySubject.subjectKind, 'recording'),
        eq(custodySubject.subjectId, recordingId),
        inArray(custodyEntry.kind, ['sealed', 'measured']),
      ),
    )
    .orderBy(desc(custodySubject.sequence));
  const said: Said = { sealed: null, measured: null };
  for (const { sequence, canonical } of rows) {
    const entry = readable(canonical);
    if (!entry) continue;
    if (entry.kind === 'sealed') {
      const detail = Sealed.safeParse(entry.detail);
      if (detail.success) said.sealed = { sequence, detail: detail.data };
    } else {
      const detail = Measured.safeParse(entry.detail);
      // The newest measuring counts.
      if (detail.success) said.measured ??= { sequence, detail: detail.data };
    }
  }
  return said;
}

/** What is no JSON any more was named when the log was read. */
function readable(canonical: string): Entry | null {
  try {
    return JSON.parse(canonical) as Entry;
  } catch {
    return null;
  }
}

/** SHA-256 in hex of an object, as it streams by; null where it is not there. */
async function hashOf(services: Needs, key: string): Promise<{ sha256: string; bytes: number } | null> {
  try {
    const { body } = await services.storage.getStream(key);
    const hash = createHash('sha256');
    let bytes = 0;
    for await (const piece of body) {
      hash.update(piece);
      bytes += piece.length;
    }
    return { sha256: hash.digest('hex'), bytes };
  } catch (error) {
    if (!(error instanceof StorageError)) throw error;
    if (error.code === 'not-found') return null;
    // Fewer bytes than the store announced: not the object that was put.
    if (error.code === 'bad-response') return { sha256: 'bytes that end early', bytes: 0 };
    throw error;
  }
}

async function auditOriginal(
  services: Needs,
  report: Report,
  row: RecordingRow,
  { sequence, detail }: NonNullable<Said['sealed']>,
  withBytes: boolean,
): Promise<void> {
  const about = { sequence, recording: row.number, key: detail.key };
  if (
    row.declaredSha256 !== detail.sha256 ||
    row.declaredBytes !== detail.bytes ||
    row.originalKey !== detail.key ||
    (row.lockKind ?? 'none') !== detail.lock
  )
    report({
      code: 'recording-changed',
      ...about,
      detail: 'Hash, length, key or lock differ from the entry.',
    });
  const found = await services.storage.head(detail.key);
  if (!found) {
    report({ code: 'original-missing', ...about, detail: 'Nothing lies under its key.' });
    return;
  }
  const lockedUntil = Date.parse(detail.lockedUntil ?? '');
  if (
    detail.lock === 'compliance' &&
    services.clock.now() < lockedUntil &&
    Math.floor((found.retainUntilMs ?? 0) / 1000) < Math.floor(lockedUntil / 1000)
  )
    report({
      code: 'original-unlocked',
      ...about,
      detail: `Locked until ${found.retainUntilMs ? new Date(found.retainUntilMs).toISOString() : 'no time'}; its entry says ${detail.lockedUntil}.`,
    });
  if (!withBytes) {
    if (found.contentLength !== detail.bytes)
      report({
        code: 'original-altered',
        ...about,
        detail: `${found.contentLength} bytes; ${detail.bytes} were sealed.`,
      });
    return;
  }
  const bytes = await hashOf(services, detail.key);
  if (bytes && bytes.sha256 !== detail.sha256)
    report({
      code: 'original-altered',
      ...about,
      detail: `Its bytes hash to ${bytes.sha256}; ${detail.sha256} was sealed.`,
    });
}

async function auditDerived(
  services: Needs,
  report: Report,
  row: RecordingRow,
  { sequence, detail }: NonNullable<Said['measured']>,
  withBytes: boolean,
): Promise<number> {
  const about = { sequence, recording: row.number };
  if (row.measuredAt !== null && row.verdict !== detail.verdict)
    report({
      code: 'verdict-changed',
      ...about,
      detail: `The row says ${row.verdict}; ${detail.verdict} was measured.`,
    });
  const rows = await services.read.select().from(derivedObject).where(eq(derivedObject.recordingId, row.id));
  for (const [kind, sha256] of Object.entries(detail.derived)) {
    const picture = rows.find((one) => one.kind === kind);
    if (!picture) {
      report({ code: 'derived-missing', ...about, detail: `The row of its ${kind} is gone.` });
      continue;
    }
    const key = { ...about, key: picture.key };
    if (picture.sha256 !== sha256 || picture.inputSha256 !== row.declaredSha256)
      report({
        code: 'derived-changed',
        ...key,
        detail: `Its ${kind} row says ${picture.sha256} of ${picture.inputSha256}.`,
      });
    if (!withBytes) continue;
    const bytes = await hashOf(services, picture.key);
    if (!bytes) report({ code: 'derived-missing', ...key, detail: `Its ${kind} is not in storage.` });
    else if (bytes.sha256 !== sha256)
      report({
        code: 'derived-altered',
        ...key,
        detail: `Its ${kind} hashes to ${bytes.sha256}; ${sha256} was made.`,
      });
  }
  return Object.keys(detail.derived).length;
}

/** Recordings that are sealed by their row and by no entry. */
async function auditUnspoken(services: Needs, report: Report): Promise<void> {
  const spoken = services.read
    .select({ one: custodySubject.sequence })
    .from(custodySubject)
    .innerJoin(custodyEntry, eq(custodyEntry.sequence, custodySubject.sequence))
    .where(
      and(
        eq(custodySubject.subjectKind, 'recording'),
        eq(custodySubject.subjectId, recording.id),
        eq(custodyEntry.kind, 'sealed'),
      ),
    );
  const rows = await services.read
    .select({ number: recording.number })
    .from(recording)
    .where(and(isNotNull(recording.sealedAt), notExists(spoken)));
  for (const { number } of rows)
    report({
      code: 'recording-without-entry',
      recording: number,
      detail: 'Its row says that it was sealed; the log does not.',
    });
}
