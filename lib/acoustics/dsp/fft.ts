interface Tables {
  cos: Float64Array;
  sin: Float64Array;
  order: Uint32Array;
}

const made = new Map<number, Tables>();

function tablesOf(size: number): Tables {
  const before = made.get(size);
  if (before) return before;
  const bits = Math.log2(size);
  const tables = {
    cos: Float64Array.from({ length: size / 2 }, (_, i) => Math.cos((2 * Math.PI * i) / size)),
    sin: Float64Array.from({ length: size / 2 }, (_, i) => -Math.sin((2 * Math.PI * i) / size)),
    order: Uint32Array.from({ length: size }, (_, i) => {
      let reversed = 0;
      for (let b = 0; b < bits; b++) reversed |= ((i >> b) & 1) << (bits - 1 - b);
      return reversed;
    }),
  };
  made.set(size, tables);
  return tables;
}

/**
 * Complex FFT in place (Cooley and Tukey 1965), for short series in double precision; tables are kept between calls.
 *
 * @param re @param im of one length, a power of two
 */
export function transform(re: Float64Array, im: Float64Array): void {
  const n = re.length;
  if (n < 2 || (n & (n - 1)) !== 0 || im.length !== n)
    throw new RangeError('an FFT is of a power of two, of both parts');
  const { cos, sin, order } = tablesOf(n);
  for (let i = 0; i < n; i++) {
    const to = order[i] as number;
    if (to <= i) continue;
    [re[i], re[to]] = [re[to] as number, re[i] as number];
    [im[i], im[to]] = [im[to] as number, im[i] as number];
  }
  for (let span = 1; span < n; span *= 2) {
    const step = n / (2 * span);
    for (let block = 0; block < n; block += 2 * span) {
      for (let i = 0, t = 0; i < span; i++, t += step) {
        const c = cos[t] as number;
        const s = sin[t] as number;
        const a = block + i;
        const b = a + span;
        const bRe = re[b] as number;
        const bIm = im[b] as number;
        const xRe = c * bRe - s * bIm;
        const xIm = c * bIm + s * bRe;
        re[b] = (re[a] as number) - xRe;
        im[b] = (im[a] as number) - xIm;
        re[a] = (re[a] as number) + xRe;
        im[a] = (im[a] as number) + xIm;
      }
    }
  }
}
