import { compareUtf8 } from './wire';

/** Records by key, with the keys in the order of a listing: by UTF-8 bytes. */
export class KeyIndex<T> {
  private readonly records = new Map<string, T>();
  private sorted: string[] = [];

  get size(): number {
    return this.records.size;
  }

  get(key: string): T | undefined {
    return this.records.get(key);
  }

  set(key: string, record: T): void {
    if (!this.records.has(key)) this.sorted.splice(this.lowerBound(key), 0, key);
    this.records.set(key, record);
  }

  delete(key: string): void {
    if (!this.records.delete(key)) return;
    this.sorted.splice(this.lowerBound(key), 1);
  }

  /** Fill in one go, which sorts once. */
  load(entries: Iterable<readonly [string, T]>): void {
    for (const [key, record] of entries) this.records.set(key, record);
    this.sorted = [...this.records.keys()].sort(compareUtf8);
  }

  keyAt(position: number): string | undefined {
    return this.sorted[position];
  }

  values(): IterableIterator<T> {
    return this.records.values();
  }

  /** Position of the first key that is not before `key`. */
  lowerBound(key: string): number {
    return this.firstWhere(0, (other) => compareUtf8(other, key) >= 0);
  }

  /** Position of the first key after `key`. */
  upperBound(key: string): number {
    return this.firstWhere(0, (other) => compareUtf8(other, key) > 0);
  }

  /** Position of the first key from `from` on that does not begin with `prefix`; such keys stand together. */
  endOfPrefix(from: number, prefix: string): number {
    return this.firstWhere(from, (other) => !other.startsWith(prefix));
  }

  private firstWhere(from: number, holds: (key: string) => boolean): number {
    let [low, high] = [from, this.sorted.length];
    while (low < high) {
      const middle = (low + high) >>> 1;
      if (holds(this.sorted[middle] as string)) high = middle;
      else low = middle + 1;
    }
    return low;
  }
}
