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
  return percentiles(values, [fraction])[0] as number;
}

/** Several at the price of one sorting. */
export function percentiles(
  values: Float32Array | Float64Array | readonly number[],
  fractions: readonly number[],
): number[] {
  // A sorted copy keeps its kind: typed arrays sort by value.
  const sorted = Array.isArray(values)
    ? Float64Array.from(values).sort()
    : (values as Float32Array | Float64Array).slice().sort();
  return fractions.map((fraction) => {
    if (sorted.length === 0) return Number.NaN;
    const at = (sorted.length - 1) * fraction;
    const low = Math.floor(at);
    const high = Math.min(sorted.length - 1, low + 1);
    return (sorted[low] as number) + ((sorted[high] as number) - (sorted[low] as number)) * (at - low);
  });
}

/** A growing Float32Array: what a long clip needs of memory is what it has used. */
export class FloatList {
  #data = new Float32Array(256);
  length = 0;

  push(value: number): void {
    if (this.length === this.#data.length) {
      const grown = new Float32Array(this.#data.length * 2);
      grown.set(this.#data);
      this.#data = grown;
    }
    this.#data[this.length++] = value;
  }

  append(values: Float32Array): void {
    if (this.length + values.length > this.#data.length) {
      const grown = new Float32Array(Math.max(2 * this.#data.length, this.length + values.length));
      grown.set(this.view());
      this.#data = grown;
    }
    this.#data.set(values, this.length);
    this.length += values.length;
  }

  view(): Float32Array {
    return this.#data.subarray(0, this.length);
  }
}
