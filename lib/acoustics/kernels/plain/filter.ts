import { type Kernels, SECTION_LENGTH } from '../types';

/** Denormals would make silence slow. */
const quiet = (z: number): number => (Math.abs(z) < 1e-30 ? 0 : z);

/** A section that lets everything through, so that two are run as three. */
const NOTHING = Float64Array.of(1, 0, 0, 0, 0, 0, 0);

function three(s: Float64Array, t: Float64Array, u: Float64Array, x: Float32Array, out: Float32Array): void {
  const [a0, a1, a2, a3, a4] = s as unknown as [number, number, number, number, number];
  const [b0, b1, b2, b3, b4] = t as unknown as [number, number, number, number, number];
  const [c0, c1, c2, c3, c4] = u as unknown as [number, number, number, number, number];
  let [p, q] = [s[5] as number, s[6] as number];
  let [r, v] = [t[5] as number, t[6] as number];
  let [w, z] = [u[5] as number, u[6] as number];
  for (let i = 0; i < x.length; i++) {
    const x1 = x[i] as number;
    const x2 = a0 * x1 + p;
    p = a1 * x1 + q - a3 * x2;
    q = a2 * x1 - a4 * x2;
    const x3 = b0 * x2 + r;
    r = b1 * x2 + v - b3 * x3;
    v = b2 * x2 - b4 * x3;
    const y = c0 * x3 + w;
    w = c1 * x3 + z - c3 * y;
    z = c2 * x3 - c4 * y;
    out[i] = y;
  }
  s[5] = quiet(p);
  s[6] = quiet(q);
  t[5] = quiet(r);
  t[6] = quiet(v);
  u[5] = quiet(w);
  u[6] = quiet(z);
}

const sectionsOf = (chain: Float64Array): [Float64Array, Float64Array, Float64Array] => {
  const section = (k: number) => chain.subarray(k * SECTION_LENGTH, (k + 1) * SECTION_LENGTH);
  return [section(0), section(1), chain.length === 3 * SECTION_LENGTH ? section(2) : NOTHING];
};

/** One of two chains whose values lie side by side. */
const everyOther = (values: Float64Array, from: 0 | 1): Float64Array =>
  Float64Array.from({ length: values.length / 2 }, (_, i) => values[2 * i + from] as number);

export const plainFilter: Pick<Kernels, 'cascade' | 'twins'> = {
  cascade(sections, x, out) {
    const [first, second, third] = sectionsOf(sections);
    three(first, second, third, x, out);
  },
  twins(sections, x, ...outs) {
    outs.forEach((out, k) => {
      const from = k === 0 ? 0 : 1;
      const chain = everyOther(sections, from);
      const [first, second, third] = sectionsOf(chain);
      three(first, second, third, x, out);
      for (let i = 0; i < chain.length; i++) sections[2 * i + from] = chain[i] as number;
    });
  },
};
