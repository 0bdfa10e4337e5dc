import { hex, sameBytes } from '../pure/hash';
import type { Finding, Report } from './findings';
import type { HeadSource, KnownHead } from './headSources';

/** A head is stored within moments; this long the outbox may be behind before it is said. */
const STORED_WITHIN_MS = 3_600_000;
/** Heads that are held to be judged at the end; beyond them nothing new is learnt. */
const MOST_HELD = 10_000;

/** One sorted source of heads, one head ahead. */
class Ahead {
  #heads: AsyncIterator<KnownHead>;
  #next: KnownHead | null = null;
  #done = false;

  constructor(heads: AsyncIterable<KnownHead>) {
    this.#heads = heads[Symbol.asyncIterator]();
  }

  /** All heads up to a size, in order. */
  async upTo(size: number): Promise<KnownHead[]> {
    const found: KnownHead[] = [];
    for (;;) {
      if (this.#next === null && !this.#done) {
        const next = await this.#heads.next();
        if (next.done) this.#done = true;
        else this.#next = next.value;
      }
      if (this.#next === null || this.#next.size > size) return found;
      found.push(this.#next);
      this.#next = null;
    }
  }
}

async function* each(heads: readonly KnownHead[]): AsyncGenerator<KnownHead> {
  yield* heads;
}

export interface HeadCounts {
  database: number;
  storage: number;
  mail: number;
}

/** Holds the heads of all three places against the tree as it is read, and against each other. */
export class HeadCheck {
  readonly counts: HeadCounts = { database: 0, storage: 0, mail: 0 };
  /** Largest tree that a head outside the database agrees with. */
  agreedTo = 0;
  #sources: Ahead[];
  #report: Report;
  #nowMs: number;
  #lastKnown = 0;
  #differing: KnownHead[] = [];
  #unknown: KnownHead[] = [];
  #beyond: KnownHead[] = [];

  constructor(
    sources: {
      database: AsyncIterable<KnownHead>;
      storage: AsyncIterable<KnownHead>;
      mail: readonly KnownHead[];
    },
    nowMs: number,
    report: Report,
  ) {
    this.#sources = [new Ahead(sources.database), new Ahead(sources.storage), new Ahead(each(sources.mail))];
    this.#nowMs = nowMs;
    this.#report = report;
  }

  async #take(size: number): Promise<KnownHead[]> {
    const found = (await Promise.all(this.#sources.map((source) => source.upTo(size)))).flat();
    for (const { source } of found) this.counts[source]++;
    return found;
  }

  /** At each size of the tree, in order. */
  async at(size: number, root: () => Uint8Array): Promise<void> {
    const heads = await this.#take(size);
    if (heads.length === 0) return;
    const computed = root();
    for (const head of heads) {
      if (sameBytes(head.root, computed)) {
        if (head.source !== 'database') this.agreedTo = size;
      } else if (this.#differing.length < MOST_HELD) this.#differing.push(head);
    }
    this.#compare(size, heads);
  }

  /** The heads of one size against each other. */
  #compare(size: number, heads: readonly KnownHead[]): void {
    const ours = heads.find(({ source }) => source === 'database');
    const outside = heads.filter(({ source }) => source !== 'database');
    if (ours) this.#lastKnown = size;
    if (!ours) {
      if (this.#unknown.length < MOST_HELD) this.#unknown.push(...outside);
      return;
    }
    const other = outside.find(({ root }) => !sameBytes(root, ours.root));
    if (other)
      this.#report({
        code: 'head-replaced',
        size,
        detail: `The database says ${hex(ours.root)}, ${other.source} says ${hex(other.root)}.`,
      });
    else if (outside.some(({ source, note }) => source === 'storage' && note !== ours.note))
      this.#report({ code: 'head-replaced', size, detail: 'Its note is not the one in storage.' });
    this.#storedInTime(ours, outside);
  }

  #storedInTime(ours: KnownHead, outside: readonly KnownHead[]): void {
    if (outside.some(({ source }) => source === 'storage')) return;
    if ((ours.madeAt ?? 0) > this.#nowMs - STORED_WITHIN_MS) return;
    this.#report({
      code: 'head-not-stored',
      size: ours.size,
      detail: 'Nothing lies in storage under its name.',
    });
  }

  /**
   * After the last entry.
   *
   * @param size of the log
   * @param explained whether entries were named that explain a tree that differs
   */
  async end(size: number, explained: (below: number) => boolean): Promise<void> {
    this.#beyond = await this.#take(Number.MAX_SAFE_INTEGER);
    const ownBeyond = this.#beyond.find(({ source }) => source === 'database');
    const outsideBeyond = this.#beyond.filter(({ source }) => source !== 'database');
    if (ownBeyond)
      this.#report({
        code: 'tail-cut',
        sequence: size,
        size: ownBeyond.size,
        detail: `The log ends at ${size} entries; a head of this database was made over ${this.#largest(this.#beyond)}.`,
      });
    else if (outsideBeyond.length > 0) this.#restored(size, outsideBeyond);
    this.#judgeUnknown(ownBeyond !== undefined || outsideBeyond.length > 0);
    this.#judgeDiffering(explained);
  }

  #largest = (heads: readonly KnownHead[]): number => Math.max(...heads.map(({ size }) => size));

  #restored(sequence: number, heads: readonly KnownHead[]): void {
    const where = [...new Set(heads.map(({ source }) => source))].join(' and ');
    this.#report({
      code: 'database-restored',
      sequence,
      size: this.#largest(heads),
      detail: `It knows heads up to ${this.#lastKnown} entries; ${where} hold one of ${this.#largest(heads)}. Entries from ${this.agreedTo} on are lost or other ones.`,
    });
  }

  /** Heads outside that the database does not have, at sizes that the log reaches. */
  #judgeUnknown(behind: boolean): void {
    // The tree went another way after a copy of yesterday was put back: what storage holds differs from what is there.
    const forked = this.#unknown.filter((head) => this.#differing.includes(head));
    const [first] = forked;
    if (first && first.size > this.agreedTo && !behind) this.#restored(this.agreedTo, forked);
    for (const head of this.#unknown) {
      if (forked.includes(head)) continue;
      this.#report({
        code: 'head-removed',
        size: head.size,
        detail: `It is kept in ${head.source} and is not in the database.`,
      });
    }
  }

  #judgeDiffering(explained: (below: number) => boolean): void {
    const bySource = (wanted: HeadSource) => this.#differing.filter(({ source }) => source === wanted);
    // The outside heads decide; the database's own are named where nothing outside says anything.
    const outside = [...bySource('storage'), ...bySource('mail')].sort((a, b) => a.size - b.size);
    const [first] = outside.length > 0 ? outside : bySource('database');
    if (!first) return;
    const finding: Finding = {
      code: explained(first.size) ? 'tree-differs' : 'tree-replaced',
      sequence: this.agreedTo,
      size: first.size,
      detail: `Entries from ${this.agreedTo} up to ${first.size - 1} are not those of the head of ${first.size} in ${first.source}.`,
    };
    this.#report(finding);
  }
}
