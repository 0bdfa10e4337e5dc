import type { Report } from './findings';

/** Numbers that are looked for at once; beyond it a gap is reported as removed at once. */
const MOST_LOOKED_FOR = 100_000;

/**
 * Whether entries stand where their own numbers say. A number that comes late was moved, one that comes twice was put
 * in, one that never comes was removed.
 */
export class OrderCheck {
  #next = 0;
  #missing = new Set<number>();
  #report: Report;

  constructor(report: Report) {
    this.#report = report;
  }

  /** @param row where it stands @param own what it says of itself */
  see(row: number, own: number, about: { recording?: string }): void {
    if (own === this.#next) {
      this.#next++;
      return;
    }
    if (own > this.#next) {
      if (own - this.#next + this.#missing.size > MOST_LOOKED_FOR) this.#gone(this.#next, own - 1);
      else for (let number = this.#next; number < own; number++) this.#missing.add(number);
      this.#next = own + 1;
      return;
    }
    const late = this.#missing.delete(own);
    this.#report({
      code: late ? 'entry-moved' : 'entry-inserted',
      sequence: row,
      ...about,
      detail: late
        ? `Entry ${own} stands at ${row}.`
        : `A second entry with the number ${own} stands at ${row}.`,
    });
  }

  end(): void {
    const left = [...this.#missing].sort((a, b) => a - b);
    for (let i = 0; i < left.length; ) {
      const first = left[i] as number;
      let last = first;
      while (left[i + 1] === last + 1) {
        last++;
        i++;
      }
      i++;
      this.#gone(first, last);
    }
  }

  #gone(first: number, last: number): void {
    this.#report({
      code: 'entry-removed',
      sequence: first,
      detail: first === last ? `Entry ${first} is gone.` : `Entries ${first} to ${last} are gone.`,
    });
  }
}
