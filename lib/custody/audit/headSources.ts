import { readFile } from 'node:fs/promises';
import { asc, gt } from 'drizzle-orm';
import { custodyHead } from '@/db/schema';
import type { Services } from '@/lib/platform/services';
import { storedHeads } from '../heads/storeHead';
import { CustodyError } from '../pure/errors';
import { hex } from '../pure/hash';
import { findHeads, parseHeadText, type TreeHead } from '../pure/head';
import { parseNote, type Verifier, verifyNote } from '../pure/note';
import type { Report } from './findings';

export type HeadSource = 'database' | 'storage' | 'mail';

/** A head that is whole, from one of the three places where heads are kept. */
export interface KnownHead {
  source: HeadSource;
  size: number;
  root: Uint8Array;
  note: string;
  madeAt: number | null;
}

const PAGE = 500;
const WHERE: Record<HeadSource, string> = {
  database: 'the database',
  storage: 'storage',
  mail: 'the auditors’ mail',
};

interface Judge {
  origin: string;
  keys: readonly Verifier[];
  report: Report;
}

async function judged(
  { origin, keys, report }: Judge,
  source: HeadSource,
  note: string,
  about: { size?: number; key?: string },
): Promise<TreeHead | null> {
  try {
    const head = parseHeadText(parseNote(note).text);
    if (head.origin !== origin) throw new CustodyError('head-origin', `it is of ${head.origin}`);
    try {
      await verifyNote(note, keys);
    } catch (error) {
      if (!(error instanceof CustodyError)) throw error;
      report({
        code: 'head-unsigned',
        size: head.size,
        ...about,
        detail: `In ${WHERE[source]}: ${error.message}.`,
      });
    }
    return head;
  } catch (error) {
    if (!(error instanceof CustodyError)) throw error;
    report({ code: 'head-unreadable', ...about, detail: `In ${WHERE[source]}: ${error.message}.` });
    return null;
  }
}

/** Heads of the database, the smallest first. */
export async function* databaseHeads(
  services: Pick<Services, 'read'>,
  judge: Judge,
): AsyncGenerator<KnownHead> {
  let after = -1;
  for (;;) {
    const rows = await services.read
      .select()
      .from(custodyHead)
      .where(gt(custodyHead.size, after))
      .orderBy(asc(custodyHead.size))
      .limit(PAGE);
    for (const row of rows) {
      after = row.size;
      const head = await judged(judge, 'database', row.note, { size: row.size });
      if (head && (head.size !== row.size || hex(head.root) !== hex(row.root)))
        judge.report({
          code: 'head-replaced',
          size: row.size,
          detail: 'Its columns are not what its note says.',
        });
      yield { source: 'database', size: row.size, root: row.root, note: row.note, madeAt: row.madeAt };
    }
    if (rows.length < PAGE) return;
  }
}

/** How many heads in storage are locked, and which are not: on a store without object lock that is nobody's doing. */
export interface LockTally {
  locked: number;
  unlocked: { key: string; size?: number }[];
}
const MOST_UNLOCKED = 1_000;

/** Heads in storage, the smallest first; two of one size are both given. */
export async function* lockedHeads(
  services: Pick<Services, 'storage' | 'clock'>,
  judge: Judge,
  tally: LockTally,
): AsyncGenerator<KnownHead> {
  for await (const { key, note } of storedHeads(services)) {
    const head = await judged(judge, 'storage', note, { key });
    const found = await services.storage.head(key);
    if ((found?.retainUntilMs ?? 0) > services.clock.now()) tally.locked++;
    else if (tally.unlocked.length < MOST_UNLOCKED)
      tally.unlocked.push({ key, ...(head ? { size: head.size } : {}) });
    if (head) yield { source: 'storage', ...head, note, madeAt: null };
  }
}

/** Quoted-printable as mail programs save it (RFC 2045, 6.7), back to text. */
function unquoted(text: string): string {
  if (!/^content-transfer-encoding:\s*quoted-printable/im.test(text)) return text;
  const bytes: number[] = [];
  const joined = text.replace(/=\r?\n/g, '');
  for (let i = 0; i < joined.length; i++) {
    const code = /^=[0-9A-F]{2}/i.test(joined.slice(i, i + 3)) ? joined.slice(i + 1, i + 3) : null;
    if (code !== null) {
      bytes.push(Number.parseInt(code, 16));
      i += 2;
    } else bytes.push(...Buffer.from(joined[i] ?? ''));
  }
  return Buffer.from(bytes).toString('utf8');
}

/** Heads out of letters saved as text, the smallest first. */
export async function mailedHeads(files: readonly string[], judge: Judge): Promise<KnownHead[]> {
  const heads: KnownHead[] = [];
  for (const file of files) {
    const notes = findHeads(unquoted(await readFile(file, 'utf8')), judge.origin);
    if (notes.length === 0) throw new Error(`${file} holds no head of ${judge.origin}`);
    for (const note of notes) {
      const head = await judged(judge, 'mail', note, {});
      if (head) heads.push({ source: 'mail', ...head, note, madeAt: null });
    }
  }
  return heads.sort((a, b) => a.size - b.size);
}
