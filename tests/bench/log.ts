import { createHash } from 'node:crypto';
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import type { Client } from '@libsql/client';
import { type Database, openDatabase } from '@/db/client';
import { applyMigrations } from '@/db/migrate';
import { appendEntries } from '@/lib/custody/append';
import { CompactTree } from '@/lib/custody/audit/compactTree';
import { type NewEntry, SERVICE_ACTOR } from '@/lib/custody/entry';
import { hashOfHex } from '@/lib/custody/pure/checkThread';
import { verifyConsistency, verifyInclusion } from '@/lib/custody/pure/proofs';
import { consistencyProof, inclusionProofs, rootAt } from '@/lib/custody/tree/prove';
import type { Figure } from './figure';

const SIZES = [1_000, 100_000, 10_000_000];
/** Odd, so that the tree has as many open subtrees as it can. */
const UNEVEN = 7;
const ROUNDS = 200;
const PROOF_MS = 20;
/**
 * From a thousand entries to ten million the tree grows from 10 to 24 levels, and its file out of the caches: by the
 * hashes alone it would be 2.4 times, in a linear log ten thousand.
 */
const MOST_GROWTH = 10;

const ENTRY: NewEntry = {
  kind: 'heard',
  actor: SERVICE_ACTOR,
  subjects: [{ kind: 'recording', id: 'a-recording' }],
  detail: { number: '7K3F-92QX' },
};

/** Stands for a hash: it only has to be another for each. */
function leafOf(sequence: number): Buffer {
  const leaf = Buffer.alloc(32);
  leaf.writeUInt32BE(sequence);
  return leaf;
}

/**
 * A log of so many entries as appending would have left it, its rows put in past the guards: filling ten million by
 * appending would measure the disk.
 */
async function fill(database: Database, size: number): Promise<void> {
  const { writer } = database;
  const triggers = await writer.execute(
    `select name, sql from sqlite_master where type = 'trigger' and tbl_name like 'custody_%'`,
  );
  for (const { name } of triggers.rows) await writer.execute(`drop trigger "${String(name)}"`);
  await writer.execute('pragma synchronous = off');
  const rows = new Rows(writer);
  const tree = new CompactTree();
  for (let sequence = 0; sequence < size; sequence++) {
    const hash = leafOf(sequence);
    await rows.entry(sequence, hash);
    await tree.add(hash, true, async (completed) => {
      await rows.node(completed.level, completed.position, completed.hash);
      return true;
    });
  }
  await rows.flush();
  for (const { sql } of triggers.rows) await writer.execute(String(sql));
  await writer.execute('pragma synchronous = full');
}

const AT_ONCE = 8_000;

class Rows {
  #writer: Client;
  #entries: (number | Uint8Array)[] = [];
  #nodes: (number | Uint8Array)[] = [];

  constructor(writer: Client) {
    this.#writer = writer;
  }

  async entry(sequence: number, hash: Uint8Array): Promise<void> {
    this.#entries.push(sequence, hash);
    if (this.#entries.length >= AT_ONCE * 2) await this.flush();
  }

  async node(level: number, position: number, hash: Uint8Array): Promise<void> {
    this.#nodes.push(level, position, hash);
  }

  async flush(): Promise<void> {
    const tx = await this.#writer.transaction('write');
    const entries = this.#entries.length / 2;
    if (entries > 0)
      await tx.execute({
        sql: `insert into custody_entry (sequence, at, kind, actor_kind, actor_id, canonical, leaf_hash) values ${Array(entries).fill("(?, 1, 'heard', 'service', 'b', '{}', ?)").join()}`,
        args: this.#entries,
      });
    const nodes = this.#nodes.length / 3;
    if (nodes > 0)
      await tx.execute({
        sql: `insert into custody_node (level, position, hash) values ${Array(nodes).fill('(?, ?, ?)').join()}`,
        args: this.#nodes,
      });
    await tx.commit();
    this.#entries = [];
    this.#nodes = [];
  }
}

const median = (values: number[]): number => [...values].sort((a, b) => a - b)[values.length >> 1] ?? 0;

async function timed(rounds: number, work: (round: number) => Promise<unknown>): Promise<number> {
  const spent: number[] = [];
  for (let round = 0; round < rounds; round++) {
    const before = performance.now();
    await work(round);
    spent.push(performance.now() - before);
  }
  return median(spent);
}

/** Places all over the log, the same in each run. */
const somewhere = (round: number, size: number): number =>
  createHash('sha256').update(`round ${round}`).digest().readUInt32BE(0) % size;

interface Spent {
  append: number;
  inclusion: number;
  consistency: number;
}

async function measure(size: number): Promise<Spent> {
  const folder = mkdtempSync(join(tmpdir(), 'bellkeep-bench-'));
  const database = await openDatabase(`file:${join(folder, 'log.db')}`);
  try {
    await applyMigrations(database);
    await fill(database, size);
    const append = (round: number) =>
      database.write((tx) => appendEntries(tx, 1_800_000_000_000 + round, [ENTRY]));
    for (let round = 0; round < 20; round++) await append(round);
    const spent: Spent = { append: await timed(ROUNDS, append), inclusion: 0, consistency: 0 };
    for (let round = 0; round < UNEVEN; round++) await append(round);
    const { read } = database;
    const total = size + 20 + ROUNDS + UNEVEN;
    const root = await rootAt(read, total);
    spent.inclusion = await timed(ROUNDS, (round) => inclusionProofs(read, [somewhere(round, total)], total));
    spent.consistency = await timed(ROUNDS, (round) =>
      consistencyProof(read, 1 + somewhere(round, total), total),
    );
    await checkProofs(database, total, root);
    return spent;
  } finally {
    database.close();
    rmSync(folder, { recursive: true, force: true });
  }
}

/** A fast proof that proves nothing is no figure. */
async function checkProofs({ read }: Database, total: number, root: Uint8Array): Promise<void> {
  for (let round = 0; round < 20; round++) {
    const [proof] = await inclusionProofs(read, [somewhere(round, total)], total);
    if (!proof) throw new Error('no proof');
    await verifyInclusion(hashOfHex(proof.leafHash), proof.sequence, total, proof.path.map(hashOfHex), root);
    const from = 1 + somewhere(round, total - 1);
    const { path } = await consistencyProof(read, from, total);
    await verifyConsistency(from, total, path.map(hashOfHex), await rootAt(read, from), root);
  }
}

/** What an append and a proof cost in logs of a thousand to ten million entries, and how that grows. */
export async function log(): Promise<Figure[]> {
  const figures: Figure[] = [];
  const all: Spent[] = [];
  for (const size of SIZES) {
    const spent = await measure(size);
    all.push(spent);
    const entries = size.toLocaleString('en-GB');
    for (const [name, value] of Object.entries(spent) as [keyof Spent, number][])
      figures.push({
        name: `log of ${entries}: ${name === 'append' ? 'append one entry' : `${name} proof`}`,
        value,
        unit: 'ms',
        target: name === 'append' ? null : PROOF_MS,
        ok: name === 'append' ? null : value <= PROOF_MS,
      });
  }
  const [small, large] = [all[0], all.at(-1)];
  if (small && large)
    for (const name of ['append', 'inclusion', 'consistency'] as const) {
      const value = large[name] / small[name];
      figures.push({
        name: `log, ten thousand times the entries: ${name}`,
        value,
        unit: 'times',
        target: MOST_GROWTH,
        ok: value <= MOST_GROWTH,
      });
    }
  return figures;
}
