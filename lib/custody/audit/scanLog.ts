import { and, asc, gt, gte, inArray, lte, sql } from 'drizzle-orm';
import { custodyEntry, custodyNode, custodySubject } from '@/db/schema';
import type { Services } from '@/lib/platform/services';
import { canonicalEntry, type Entry } from '../entry';
import { sameBytes } from '../pure/hash';
import { leafHashNow } from '../tree/hashes';
import { CompactTree, type Completed } from './compactTree';
import type { Report } from './findings';
import type { HeadCheck } from './headCheck';
import { OrderCheck } from './order';
import { storedNodes } from './storedNodes';

const PAGE = 2_000;
/**
 * A writer looks at its clock before it waits its turn, and measuring a long clip takes its time: entries a little out
 * of order are no clock that was set back.
 */
const CLOCK_TOLERANCE_MS = 120_000;
const MOST_KEPT = 1_000;

type Row = typeof custodyEntry.$inferSelect;
type Needs = Pick<Services, 'read'>;

interface Scan {
  report: Report;
  order: OrderCheck;
  previousAt: number;
  /** First rows of entries that were named, for whoever asks what explains a tree that differs. */
  firstNamed: number;
  /** Subtrees that are not the hash of what is below them. */
  wrongNodes: Completed[];
  missingNodes: Completed[];
}

/** Read the whole log from its beginning, in pages, and name what is not as it was. @returns entries read */
export async function scanLog(services: Needs, heads: HeadCheck, report: Report): Promise<number> {
  const scan: Scan = {
    report,
    order: new OrderCheck((finding) => {
      named(scan, finding.sequence ?? 0);
      report(finding);
    }),
    previousAt: Number.NEGATIVE_INFINITY,
    firstNamed: Number.POSITIVE_INFINITY,
    wrongNodes: [],
    missingNodes: [],
  };
  const tree = new CompactTree();
  const nodeAt = storedNodes(services);
  const judge = async (completed: Completed) => judgeNode(scan, completed, nodeAt);
  let after = Number.MIN_SAFE_INTEGER;
  for (;;) {
    const rows = await services.read
      .select()
      .from(custodyEntry)
      .where(gt(custodyEntry.sequence, after))
      .orderBy(asc(custodyEntry.sequence))
      .limit(PAGE);
    const subjects = await subjectsOf(services, rows);
    for (const row of rows) {
      const whole = judgeEntry(scan, row, subjects.get(row.sequence) ?? []);
      await tree.add(leafHashNow(row.canonical), whole, judge);
      await heads.at(tree.size, () => tree.root());
    }
    after = rows.at(-1)?.sequence ?? after;
    if (rows.length < PAGE) break;
  }
  scan.order.end();
  await judgeNodesBeyond(services, scan, tree.size);
  resolveNodes(scan, heads.agreedTo);
  await heads.end(tree.size, (below) => scan.firstNamed < below);
  return tree.size;
}

const named = (scan: Scan, sequence: number): void => {
  scan.firstNamed = Math.min(scan.firstNamed, sequence);
};

async function subjectsOf(services: Needs, rows: readonly Row[]): Promise<Map<number, string[]>> {
  const first = rows[0]?.sequence;
  const last = rows.at(-1)?.sequence;
  const found = new Map<number, string[]>();
  if (first === undefined || last === undefined) return found;
  const all = await services.read
    .select()
    .from(custodySubject)
    .where(and(gte(custodySubject.sequence, first), lte(custodySubject.sequence, last)));
  for (const { sequence, subjectKind, subjectId } of all)
    found.set(sequence, [...(found.get(sequence) ?? []), `${subjectKind} ${subjectId}`]);
  return found;
}

function parsed(row: Row): Entry | null {
  try {
    const entry = JSON.parse(row.canonical) as Entry;
    return canonicalEntry(entry) === row.canonical ? entry : null;
  } catch {
    return null;
  }
}

/** @returns whether the entry's text is the one that its stored leaf hash is over */
function judgeEntry(scan: Scan, row: Row, subjects: readonly string[]): boolean {
  const { sequence } = row;
  const entry = parsed(row);
  const number = entry?.detail?.number;
  const about = { sequence, ...(typeof number === 'string' ? { recording: number } : {}) };
  const whole = sameBytes(leafHashNow(row.canonical), row.leafHash);
  if (!whole) {
    named(scan, sequence);
    scan.report({ code: 'entry-edited', ...about, detail: 'Its text is not the one that was hashed.' });
  }
  if (!entry) {
    scan.report({ code: 'entry-unreadable', ...about, detail: 'Its text is no canonical JSON.' });
    return whole;
  }
  scan.order.see(sequence, entry.sequence, typeof number === 'string' ? { recording: number } : {});
  judgeColumns(scan, row, entry, subjects, about);
  const at = Date.parse(entry.at);
  if (at < scan.previousAt - CLOCK_TOLERANCE_MS)
    scan.report({
      code: 'clock-set-back',
      ...about,
      detail: `Dated ${entry.at}, after an entry of ${new Date(scan.previousAt).toISOString()}.`,
    });
  scan.previousAt = at;
  return whole;
}

function judgeColumns(
  scan: Scan,
  row: Row,
  entry: Entry,
  subjects: readonly string[],
  about: { sequence: number; recording?: string },
): void {
  const differing = [
    row.at === Date.parse(entry.at) ? '' : 'time',
    row.kind === entry.kind ? '' : 'kind',
    row.actorKind === entry.actor.kind && row.actorId === entry.actor.id ? '' : 'actor',
  ].filter(Boolean);
  if (differing.length > 0)
    scan.report({
      code: 'columns-changed',
      ...about,
      detail: `Its ${differing.join(' and ')} columns differ.`,
    });
  const said = new Set(entry.subjects.map(({ kind, id }) => `${kind} ${id}`));
  const lost = [...said].filter((subject) => !subjects.includes(subject));
  const more = subjects.filter((subject) => !said.has(subject));
  if (lost.length > 0 || more.length > 0)
    scan.report({
      code: 'thread-changed',
      ...about,
      detail: [
        lost.length > 0 ? `taken out of the thread of ${lost.join(', ')}` : '',
        more.length > 0 ? `put into the thread of ${more.join(', ')}` : '',
      ]
        .filter(Boolean)
        .join('; '),
    });
}

async function judgeNode(
  scan: Scan,
  completed: Completed,
  nodeAt: (level: number, position: number) => Promise<Uint8Array | null>,
): Promise<boolean> {
  const stored = await nodeAt(completed.level, completed.position);
  if (stored && sameBytes(stored, completed.hash)) return true;
  // What differs below is the reason; only the lowest is kept.
  if (!completed.wholeBelow) return false;
  const kept = stored ? scan.wrongNodes : scan.missingNodes;
  if (kept.length < MOST_KEPT) kept.push(completed);
  return false;
}

const firstOf = ({ level, position }: Completed): number => position * 2 ** level;
const endOf = ({ level, position }: Completed): number => (position + 1) * 2 ** level;

/**
 * A pair of entries whose stored subtree differs: the entries were changed together with their leaf hashes, unless a
 * head outside the database vouches for them; then the subtree was.
 */
function resolveNodes(scan: Scan, vouchedTo: number): void {
  for (const node of scan.wrongNodes) {
    const [first, end] = [firstOf(node), endOf(node)];
    if (node.level === 1 && end > vouchedTo) {
      named(scan, first);
      scan.report({
        code: 'entry-edited',
        sequence: first,
        detail: `Entry ${first} or ${end - 1} was changed together with its leaf hash: their subtree is of another text.`,
      });
    } else
      scan.report({
        code: 'subtree-changed',
        sequence: first,
        detail: `The stored hash of entries ${first} to ${end - 1} is not theirs.`,
      });
  }
  for (const node of scan.missingNodes)
    scan.report({
      code: 'subtree-missing',
      sequence: firstOf(node),
      detail: `The hash of entries ${firstOf(node)} to ${endOf(node) - 1} is not stored.`,
    });
}

/** Subtrees of entries that are not there: the log was longer. */
async function judgeNodesBeyond(services: Needs, scan: Scan, size: number): Promise<void> {
  const tops = await services.read
    .select({ level: custodyNode.level, last: sql<number>`max(${custodyNode.position})` })
    .from(custodyNode)
    .where(
      inArray(
        custodyNode.level,
        Array.from({ length: 53 }, (_, i) => i + 1),
      ),
    )
    .groupBy(custodyNode.level);
  const lost = Math.max(0, ...tops.map(({ level, last }) => (last + 1) * 2 ** level));
  if (lost > size)
    scan.report({
      code: 'tail-cut',
      sequence: size,
      detail: `The log ends at ${size} entries; subtrees of ${lost} are stored.`,
    });
}
