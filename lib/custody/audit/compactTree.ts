import { foldHashes, nodeHashNow } from '../tree/hashes';

export interface Completed {
  level: number;
  position: number;
  hash: Uint8Array;
  /** Whether both halves are what is stored. */
  wholeBelow: boolean;
}

/** The tree of a log that is read from its beginning, in as many hashes as it is high. */
export class CompactTree {
  #size = 0;
  #stack: { level: number; hash: Uint8Array; whole: boolean }[] = [];

  get size(): number {
    return this.#size;
  }

  /**
   * Add the next leaf.
   *
   * @param judge told of each subtree that is completed; says whether it is what is stored
   */
  async add(
    leaf: Uint8Array,
    whole: boolean,
    judge: (completed: Completed) => Promise<boolean>,
  ): Promise<void> {
    let top = { level: 0, hash: leaf, whole };
    this.#size++;
    for (;;) {
      const left = this.#stack.at(-1);
      if (!left || left.level !== top.level) break;
      this.#stack.pop();
      const level = top.level + 1;
      const completed: Completed = {
        level,
        position: this.#size / 2 ** level - 1,
        hash: nodeHashNow(left.hash, top.hash),
        wholeBelow: left.whole && top.whole,
      };
      top = { level, hash: completed.hash, whole: await judge(completed) };
    }
    this.#stack.push(top);
  }

  root(): Uint8Array {
    return foldHashes(this.#stack.map(({ hash }) => hash));
  }
}
