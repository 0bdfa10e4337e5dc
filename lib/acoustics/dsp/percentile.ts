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

/** Several at once. The fractions in rising order cost least. */
export function percentiles(
  values: Float32Array | Float64Array | readonly number[],
  fractions: readonly number[],
): number[] {
  const own = Float64Array.from(values as ArrayLike<number>);
  return fractions.map((fraction) => {
    if (own.length === 0) return Number.NaN;
    const at = (own.length - 1) * fraction;
    const low = Math.floor(at);
    select(own, low);
    const here = own[low] as number;
    if (at === low) return here;
    // What follows the selected one is no smaller: the next is the least of it.
    let next = own[low + 1] as number;
    for (let i = low + 2; i < own.length; i++) if ((own[i] as number) < next) next = own[i] as number;
    return here + (next - here) * (at - low);
  });
}

/**
 * Put the value of a rank where sorting would put it, nothing larger before and nothing smaller behind it (Hoare's
 * selection, 1961).
 */
function select(values: Float64Array, rank: number): void {
  let left = 0;
  let right = values.length - 1;
  while (left < right) {
    const pivot = values[(left + right) >> 1] as number;
    // Nothing compares to NaN: leave such values where they are.
    if (Number.isNaN(pivot)) return;
    let i = left;
    let j = right;
    while (i <= j) {
      while ((values[i] as number) < pivot) i++;
      while ((values[j] as number) > pivot) j--;
      if (i > j) break;
      const kept = values[i] as number;
      values[i++] = values[j] as number;
      values[j--] = kept;
    }
    if (rank <= j) right = j;
    else if (rank >= i) left = i;
    else return;
  }
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
