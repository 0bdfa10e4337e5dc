import type { Services } from '@/lib/platform/services';
import { headKeys } from '../heads/headKeys';
import { parseVerifier } from '../pure/note';
import type { AuditCode, Finding } from './findings';
import { HeadCheck, type HeadCounts } from './headCheck';
import { databaseHeads, type LockTally, lockedHeads, mailedHeads } from './headSources';
import { auditObjects, type ObjectCounts } from './objects';
import { scanLog } from './scanLog';

export interface AuditOptions {
  /** Letters to the auditors, saved as text. */
  headFiles: readonly string[];
  /** Verifier key strings to trust instead of those in the database. */
  keys: readonly string[];
  /** Look at the bytes of originals and pictures, not only at their presence, length and lock. */
  withBytes: boolean;
  onFinding(finding: Finding): void;
}

export interface AuditResult {
  ok: boolean;
  entries: number;
  heads: HeadCounts;
  objects: ObjectCounts;
  /** How many of each code, also of those that were not told one by one. */
  counts: Partial<Record<AuditCode, number>>;
}

/** Of one code this many are told one by one; a log that was shifted would name every entry. */
const MOST_OF_A_CODE = 200;

/**
 * Recompute everything from the entries up, and hold it against the heads in the database, in locked storage and in the
 * auditors' mail, and against every object in storage. Reads in pages and streams: memory does not grow with the log.
 * It writes nothing.
 *
 * @throws Error where a head file holds no head or a key is none; StorageError, DrizzleError where it cannot go on
 */
export async function auditCustody(
  services: Pick<Services, 'read' | 'storage' | 'clock' | 'env'>,
  options: AuditOptions,
): Promise<AuditResult> {
  const counts: AuditResult['counts'] = {};
  const report = (finding: Finding) => {
    const count = (counts[finding.code] ?? 0) + 1;
    counts[finding.code] = count;
    if (count <= MOST_OF_A_CODE) options.onFinding(finding);
  };
  const lines =
    options.keys.length > 0
      ? options.keys
      : (await headKeys(services))
          .filter(({ compromisedAt }) => compromisedAt === null)
          .map(({ verifier }) => verifier);
  const keys = await Promise.all(lines.map((line) => parseVerifier(line)));
  const judge = { origin: services.env.BELLKEEP_CUSTODY_ORIGIN, keys, report };
  const tally: LockTally = { locked: 0, unlocked: [] };
  const heads = new HeadCheck(
    {
      database: databaseHeads(services, judge),
      storage: lockedHeads(services, judge, tally),
      mail: await mailedHeads(options.headFiles, judge),
    },
    services.clock.now(),
    report,
  );
  const entries = await scanLog(services, heads, report);
  const objects = await auditObjects(services, report, options.withBytes);
  // Where anything was ever locked the store can lock, and what is not was unlocked.
  if (tally.locked > 0 || objects.lockedOriginals > 0)
    for (const head of tally.unlocked)
      report({
        code: 'head-unlocked',
        ...head,
        detail: 'Whoever has the store’s credentials can remove it.',
      });
  return { ok: Object.keys(counts).length === 0, entries, heads: heads.counts, objects, counts };
}
