/**
 * Value at a fraction of a sorted copy, linearly interpolated (the "type 7" of Hyndman and Fan 1996, from memory).
 *
 * @param values any length; @param fraction 0 to 1
 * @returns NaN for no values
 */
export function percentile(
  values: Float32Array | Float64Array | readonly number[],
  fraction: number,
): number {
  if (values.length === 0) return Number.NaN;
  const sorted = Float64Array.from(values).sort();
  const at = (sorted.length - 1) * fraction;
  const low = Math.floor(at);
  const high = Math.min(sorted.length - 1, low + 1);
  return (sorted[low] as number) + ((sorted[high] as number) - (sorted[low] as number)) * (at - low);
}

/** A growing Float32Array: what a long clip needs of memory is what it has used. */
export class FloatList {
  #data = new Float32Array(1024);
  length = 0;

  push(value: number): void {
    if (this.length === this.#data.length) {
      const grown = new Float32Array(this.#data.length * 2);
      grown.set(this.#data);
      this.#data = grown;
    }
    this.#data[this.length++] = value;
  }

  view(): Float32Array {
    return this.#data.subarray(0, this.length);
  }
}
