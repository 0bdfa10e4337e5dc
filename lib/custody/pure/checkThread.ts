import { checkLeaves } from './checkLeaves';
import { CustodyError } from './errors';
import { fromHex, type Hash, hex, sha256 } from './hash';
import { type TreeHead, verifyHead } from './head';
import { parseVerifier, type Verifier } from './note';
import { verifyConsistency, verifyInclusion } from './proofs';

export const CHECK_IDS = ['leaves', 'signature', 'inclusion', 'consistency', 'locked', 'original'] as const;
export type CheckId = (typeof CHECK_IDS)[number];

/** `unchecked`: it could not be checked, which is neither right nor wrong. */
export type CheckState = 'waiting' | 'running' | 'right' | 'wrong' | 'unchecked';

export interface Check {
  id: CheckId;
  state: CheckState;
  /** The value that was computed or compared, short. */
  value: string;
  /** A sentence, where there is more to say. */
  detail: string;
}

export interface ThreadLeaf {
  sequence: number;
  canonical: string;
  leafHash: string;
}

export interface CheckedThread {
  entries: readonly ThreadLeaf[];
  /** SHA-256 that the recording's row gives, hex; null where the thread is not one of a recording. */
  sha256: string | null;
}

export interface HeadsAnswer {
  origin: string;
  rows: readonly { size: number; note: string }[];
}

/** Where a check gets its evidence from. Each throws where there is no answer, and `missing` says that there is none. */
export interface Sources {
  heads(): Promise<HeadsAnswer>;
  /** Published verifier key strings. */
  keys(): Promise<string[]>;
  inclusion(sequences: number[], size: number): Promise<{ sequence: number; path: string[] }[]>;
  consistency(from: number, to: number): Promise<string[]>;
  /** The head of a size as storage keeps it; null where it is not there yet. */
  locked(size: number): Promise<string | null>;
  /** Bytes of the original; null where this person does not open it. */
  original: (() => Promise<Uint8Array>) | null;
}

type Report = (check: Check) => void;
type Outcome = Omit<Check, 'id'>;
const right = (value: string, detail = ''): Outcome => ({ state: 'right', value, detail });
const wrong = (value: string, detail: string): Outcome => ({ state: 'wrong', value, detail });
const unchecked = (value: string, detail: string): Outcome => ({ state: 'unchecked', value, detail });

const words = (error: unknown): string => (error instanceof Error ? error.message : 'no answer');
const short = (hash: string): string => `${hash.slice(0, 8)}…${hash.slice(-6)}`;

/** A refusal of the mathematics is wrong; no answer from the network is not checked. */
function failed(error: unknown): Outcome {
  if (error instanceof CustodyError && error.code === 'ed25519-missing')
    return unchecked(
      'not in this browser',
      'This browser does not check Ed25519 signatures. Use a current one, or the evidence package and openssl.',
    );
  if (error instanceof CustodyError) return wrong(error.code, error.message);
  return unchecked('no answer', words(error));
}

async function one(id: CheckId, report: Report, check: () => Promise<Outcome>): Promise<CheckState> {
  report({ id, state: 'running', value: '', detail: '' });
  let outcome: Outcome;
  try {
    outcome = await check();
  } catch (error) {
    outcome = failed(error);
  }
  report({ id, ...outcome });
  return outcome.state;
}

export const hashOfHex = (text: string): Hash => {
  const bytes = fromHex(text);
  if (bytes?.length !== 32) throw new CustodyError('proof-hash', 'a hash is not 32 bytes in hex');
  return bytes;
};

interface Heads {
  origin: string;
  trusted: Verifier[];
  newest: (TreeHead & { note: string }) | null;
  earlier: { size: number; note: string } | null;
}

/**
 * Check a thread against the signed log, with evidence that may come from anywhere: nothing a source says is believed
 * without its hash, path or signature. Each check is reported when it begins and when it is done.
 *
 * @param held a head that the reader holds, as a signed note: the log must be consistent with it
 */
export async function checkThread(
  thread: CheckedThread,
  sources: Sources,
  report: Report,
  held?: string,
): Promise<void> {
  await one('leaves', report, () => leavesOf(thread));
  const heads: Heads = { origin: '', trusted: [], newest: null, earlier: null };
  await one('signature', report, () => signatureOf(sources, heads));
  await one('inclusion', report, () => inclusionOf(thread, sources, heads));
  await one('consistency', report, () => consistencyOf(sources, heads, held));
  await one('locked', report, () => lockedOf(sources, heads));
}

/** The original's bytes against the hash that was sealed. Apart from the others, because fetching it is an entry. */
export async function checkOriginal(thread: CheckedThread, sources: Sources, report: Report): Promise<void> {
  await one('original', report, async () => {
    if (!sources.original) return unchecked('not opened', 'Your role does not open originals.');
    const sealed = sealedHash(thread);
    if (sealed === null) return unchecked('not sealed', 'No entry says what was sealed.');
    const bytes = await sources.original();
    const computed = hex(await sha256(bytes));
    if (computed !== sealed)
      return wrong(short(computed), `The bytes in storage hash to ${computed}; ${sealed} was sealed.`);
    return right(short(computed), `${bytes.length.toLocaleString('en-GB')} bytes hash to ${computed}.`);
  });
}

/** The hash in the entry of the log, which the log's checks prove; the row's only where the entry is on another page. */
function sealedHash(thread: CheckedThread): string | null {
  for (const { canonical } of thread.entries) {
    const entry = JSON.parse(canonical) as { kind?: string; detail?: { sha256?: unknown } };
    if (entry.kind === 'sealed' && typeof entry.detail?.sha256 === 'string') return entry.detail.sha256;
  }
  return thread.sha256;
}

async function leavesOf(thread: CheckedThread): Promise<Outcome> {
  const checks = await checkLeaves(thread.entries);
  const bad = checks.filter((check) => !check.right);
  const value = `${checks.length - bad.length} of ${checks.length}`;
  return bad.length === 0
    ? right(value)
    : wrong(
        value,
        `Not the text that was hashed: entry ${bad.map(({ sequence }) => sequence.toLocaleString('en-GB')).join(', ')}.`,
      );
}

async function signatureOf(sources: Sources, heads: Heads): Promise<Outcome> {
  const [answer, lines] = await Promise.all([sources.heads(), sources.keys()]);
  heads.origin = answer.origin;
  heads.trusted = await Promise.all(lines.map((line) => parseVerifier(line)));
  const [newest] = answer.rows;
  if (!newest)
    return unchecked('no head yet', 'The first head is signed within a minute of the first entry.');
  const head = await verifyHead(newest.note, answer.origin, heads.trusted);
  heads.newest = { ...head, note: newest.note };
  heads.earlier = answer.rows.length > 1 ? (answer.rows.at(-1) ?? null) : null;
  return right(
    'Ed25519',
    `By key ${head.by[0]?.keyId} over ${head.size.toLocaleString('en-GB')} entries, root ${short(hex(head.root))}.`,
  );
}

async function inclusionOf(thread: CheckedThread, sources: Sources, heads: Heads): Promise<Outcome> {
  const head = heads.newest;
  if (!head) return unchecked('no head', 'There is no signed head to look for the entries in.');
  const inside = thread.entries.filter(({ sequence }) => sequence < head.size);
  const later = thread.entries.length - inside.length;
  if (inside.length === 0)
    return unchecked('too new', 'The entries are newer than the head; the next one is made within a minute.');
  const proofs = await sources.inclusion(
    inside.map(({ sequence }) => sequence),
    head.size,
  );
  let hashes = 0;
  for (const { sequence, leaf } of await leavesComputed(inside)) {
    const proof = proofs.find((found) => found.sequence === sequence);
    if (!proof) return wrong('no proof', `No proof was given for entry ${sequence}.`);
    try {
      await verifyInclusion(leaf, sequence, head.size, proof.path.map(hashOfHex), head.root);
    } catch (error) {
      return { ...failed(error), detail: `Entry ${sequence.toLocaleString('en-GB')}: ${words(error)}` };
    }
    hashes = Math.max(hashes, proof.path.length);
  }
  return right(
    `${inside.length} of ${thread.entries.length}`,
    `Each by at most ${hashes} hashes.${later > 0 ? ` ${later} newer than the head; the next one is made within a minute.` : ''}`,
  );
}

/** Leaves from the text that is shown, not from the hashes that came with it. */
async function leavesComputed(entries: readonly ThreadLeaf[]): Promise<{ sequence: number; leaf: Hash }[]> {
  const checks = await checkLeaves(entries);
  return checks.map(({ sequence, computed }) => ({ sequence, leaf: hashOfHex(computed) }));
}

async function consistencyOf(sources: Sources, heads: Heads, held: string | undefined): Promise<Outcome> {
  const head = heads.newest;
  if (!head) return unchecked('no head', 'There is no signed head to compare.');
  const note = held ?? heads.earlier?.note;
  if (note === undefined)
    return unchecked('one head', 'This is the first head; there is no earlier one to compare with.');
  const other = await verifyHead(note, heads.origin, heads.trusted);
  const [older, newer] = other.size <= head.size ? [other, head] : [head, other];
  const path = older.size === newer.size ? [] : await sources.consistency(older.size, newer.size);
  await verifyConsistency(older.size, newer.size, path.map(hashOfHex), older.root, newer.root);
  return right(
    `${older.size.toLocaleString('en-GB')} → ${newer.size.toLocaleString('en-GB')}`,
    held === undefined
      ? 'The earlier tree is whole inside the newer one.'
      : 'The head you hold is of this very log.',
  );
}

async function lockedOf(sources: Sources, heads: Heads): Promise<Outcome> {
  const head = heads.newest;
  if (!head) return unchecked('no head', 'There is no signed head to compare.');
  const kept = await sources.locked(head.size);
  if (kept === null)
    return unchecked('not there yet', 'Storage is given each head moments after it is made.');
  return kept === head.note
    ? right(`${head.size.toLocaleString('en-GB')}`, 'Byte for byte the same.')
    : wrong('another head', 'Storage holds another head of this size. Tell the auditor and IT.');
}
