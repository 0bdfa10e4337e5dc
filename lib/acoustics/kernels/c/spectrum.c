/* Power spectra of four real frames at once, one a lane, and what is read off them. Plain twin: ../plain/spectrum.ts. */
#include <wasm_simd128.h>

static inline void transpose(v128_t *a, v128_t *b, v128_t *c, v128_t *d) {
  const v128_t ab = wasm_i32x4_shuffle(*a, *b, 0, 4, 1, 5), ab2 = wasm_i32x4_shuffle(*a, *b, 2, 6, 3, 7);
  const v128_t cd = wasm_i32x4_shuffle(*c, *d, 0, 4, 1, 5), cd2 = wasm_i32x4_shuffle(*c, *d, 2, 6, 3, 7);
  *a = wasm_i64x2_shuffle(ab, cd, 0, 2);
  *b = wasm_i64x2_shuffle(ab, cd, 1, 3);
  *c = wasm_i64x2_shuffle(ab2, cd2, 0, 2);
  *d = wasm_i64x2_shuffle(ab2, cd2, 1, 3);
}

#define ADD wasm_f32x4_add
#define SUB wasm_f32x4_sub
#define MUL wasm_f32x4_mul

/* z: pairs of re and im vectors in bit-reversed order; w: pairs of cos and -sin of 2 pi k / half. */
static void transform(v128_t *z, const float *w, int half) {
  int span = 1;
  if (__builtin_ctz(half) & 1) {
    for (int a = 0; a < 2 * half; a += 4) {
      const v128_t re = z[a + 2], im = z[a + 3];
      z[a + 2] = SUB(z[a], re);
      z[a + 3] = SUB(z[a + 1], im);
      z[a] = ADD(z[a], re);
      z[a + 1] = ADD(z[a + 1], im);
    }
    span = 2;
  }
  /* Two stages of radix 2 in registers: half the traffic with memory. */
  for (; span < half; span *= 4) {
    const int far = half / (2 * span), near = half / (4 * span);
    for (int i = 0; i < span; i++) {
      const v128_t c1 = wasm_f32x4_splat(w[2 * i * far]), s1 = wasm_f32x4_splat(w[2 * i * far + 1]);
      const v128_t c2 = wasm_f32x4_splat(w[2 * i * near]), s2 = wasm_f32x4_splat(w[2 * i * near + 1]);
      for (int block = i; block < half; block += 4 * span) {
        v128_t *a = z + 2 * block, *b = a + 2 * span, *c = b + 2 * span, *d = c + 2 * span;
        const v128_t bre = SUB(MUL(c1, b[0]), MUL(s1, b[1])), bim = ADD(MUL(c1, b[1]), MUL(s1, b[0]));
        const v128_t dre = SUB(MUL(c1, d[0]), MUL(s1, d[1])), dim = ADD(MUL(c1, d[1]), MUL(s1, d[0]));
        const v128_t a0 = ADD(a[0], bre), a1 = ADD(a[1], bim), b0 = SUB(a[0], bre), b1 = SUB(a[1], bim);
        const v128_t c0 = ADD(c[0], dre), cc = ADD(c[1], dim), d0 = SUB(c[0], dre), d1 = SUB(c[1], dim);
        const v128_t cre = SUB(MUL(c2, c0), MUL(s2, cc)), cim = ADD(MUL(c2, cc), MUL(s2, c0));
        const v128_t ere = SUB(MUL(c2, d0), MUL(s2, d1)), eim = ADD(MUL(c2, d1), MUL(s2, d0));
        a[0] = ADD(a0, cre);
        a[1] = ADD(a1, cim);
        c[0] = SUB(a0, cre);
        c[1] = SUB(a1, cim);
        /* times -i */
        b[0] = ADD(b0, eim);
        b[1] = SUB(b1, ere);
        d[0] = SUB(b0, eim);
        d[1] = ADD(b1, ere);
      }
    }
  }
}

/*
 * |X|^2 of `count` frames that begin `hop` apart; `bins` values a frame, frame by frame.
 * order: place of each pair of samples; twiddles: half / 2 + 1 pairs; split: half + 1 pairs of cos and -sin of pi k / half;
 * work: room for half pairs of vectors and bins + 4 vectors.
 */
__attribute__((export_name("spectra"))) void spectra(const float *window, const int *order, const float *twiddles,
                                                     const float *split, v128_t *work, const float *x, int size,
                                                     int hop, int count, int bins, float *out) {
  const int half = size / 2;
  v128_t *z = work, *power = work + 2 * half;
  const v128_t quarter = wasm_f32x4_splat(0.5f);
  for (int frame = 0; frame < count; frame += 4) {
    const int here = count - frame < 4 ? count - frame : 4;
    const float *f0 = x + frame * hop, *f1 = here > 1 ? f0 + hop : f0, *f2 = here > 2 ? f0 + 2 * hop : f0,
                *f3 = here > 3 ? f0 + 3 * hop : f0;
    for (int i = 0; i < size; i += 4) {
      const v128_t weight = wasm_v128_load(window + i);
      v128_t a = MUL(wasm_v128_load(f0 + i), weight), b = MUL(wasm_v128_load(f1 + i), weight);
      v128_t c = MUL(wasm_v128_load(f2 + i), weight), d = MUL(wasm_v128_load(f3 + i), weight);
      transpose(&a, &b, &c, &d);
      v128_t *first = z + 2 * order[i / 2], *second = z + 2 * order[i / 2 + 1];
      first[0] = a;
      first[1] = b;
      second[0] = c;
      second[1] = d;
    }
    transform(z, twiddles, half);
    for (int k = 0; k < bins; k++) {
      const v128_t *p = z + 2 * (k == half ? 0 : k), *q = z + 2 * (k == 0 ? 0 : half - k);
      const v128_t cos = wasm_f32x4_splat(split[2 * k]), sin = wasm_f32x4_splat(split[2 * k + 1]);
      const v128_t evenRe = ADD(p[0], q[0]), evenIm = SUB(p[1], q[1]);
      const v128_t oddRe = ADD(p[1], q[1]), oddIm = SUB(q[0], p[0]);
      const v128_t re = MUL(quarter, ADD(evenRe, SUB(MUL(cos, oddRe), MUL(sin, oddIm))));
      const v128_t im = MUL(quarter, ADD(evenIm, ADD(MUL(cos, oddIm), MUL(sin, oddRe))));
      power[k] = ADD(MUL(re, re), MUL(im, im));
    }
    float *to = out + frame * bins;
    int k = 0;
    for (; k + 4 <= bins; k += 4) {
      v128_t a = power[k], b = power[k + 1], c = power[k + 2], d = power[k + 3];
      transpose(&a, &b, &c, &d);
      wasm_v128_store(to + k, a);
      if (here > 1) wasm_v128_store(to + bins + k, b);
      if (here > 2) wasm_v128_store(to + 2 * bins + k, c);
      if (here > 3) wasm_v128_store(to + 3 * bins + k, d);
    }
    for (; k < bins; k++) {
      to[k] = wasm_f32x4_extract_lane(power[k], 0);
      if (here > 1) to[bins + k] = wasm_f32x4_extract_lane(power[k], 1);
      if (here > 2) to[2 * bins + k] = wasm_f32x4_extract_lane(power[k], 2);
      if (here > 3) to[3 * bins + k] = wasm_f32x4_extract_lane(power[k], 3);
    }
  }
}

/* Base-2 logarithm of positive normal numbers: exponent, and a polynomial of the mantissa about 1 (error below 1.5e-5). */
static inline v128_t log2of(v128_t x) {
  const v128_t exponent = wasm_f32x4_convert_i32x4(wasm_i32x4_sub(wasm_u32x4_shr(x, 23), wasm_i32x4_splat(127)));
  const v128_t m = wasm_v128_or(wasm_v128_and(x, wasm_i32x4_splat(0x007fffff)), wasm_i32x4_splat(0x3f800000));
  const v128_t t = wasm_f32x4_sub(m, wasm_f32x4_splat(1.5f));
  /* Least squares of degree 5 on 64 Chebyshev nodes of [1, 2), about 1.5. */
  v128_t y = wasm_f32x4_splat(0.04392863f);
  y = ADD(MUL(y, t), wasm_f32x4_splat(-0.08001088f));
  y = ADD(MUL(y, t), wasm_f32x4_splat(0.14171816f));
  y = ADD(MUL(y, t), wasm_f32x4_splat(-0.31974910f));
  y = ADD(MUL(y, t), wasm_f32x4_splat(0.96182123f));
  y = ADD(MUL(y, t), wasm_f32x4_splat(0.58495050f));
  return ADD(exponent, y);
}

static const float DB_PER_OCTAVE = 3.0102999566f;

/* 10 lg (power * scale + least) as bytes of `step` decibels above `floor`; n is rounded up to a multiple of 16. */
__attribute__((export_name("shades"))) void shades(const float *power, int n, float scale, float least, float floor,
                                                   float step, unsigned char *out) {
  const v128_t by = wasm_f32x4_splat(scale), plus = wasm_f32x4_splat(least);
  const v128_t slope = wasm_f32x4_splat(DB_PER_OCTAVE / step), shift = wasm_f32x4_splat(-floor / step);
  for (int i = 0; i < n; i += 16) {
    v128_t v[4];
    for (int k = 0; k < 4; k++)
      v[k] = wasm_i32x4_trunc_sat_f32x4(wasm_f32x4_nearest(
          ADD(MUL(slope, log2of(ADD(MUL(wasm_v128_load(power + i + 4 * k), by), plus))), shift)));
    wasm_v128_store(out + i, wasm_u8x16_narrow_i16x8(wasm_i16x8_narrow_i32x4(v[0], v[1]), wasm_i16x8_narrow_i32x4(v[2], v[3])));
  }
}

static inline int atMost(const unsigned char *shades, int from, int to, v128_t limit) {
  int count = 0;
  for (int i = from; i < to; i += 16) {
    int below = wasm_i8x16_bitmask(wasm_u8x16_le(wasm_v128_load(shades + i), limit));
    if (to - i < 16) below &= (1 << (to - i)) - 1;
    count += __builtin_popcount(below);
  }
  return count;
}

/*
 * Local maxima of each row between bins `low` and `high`, no lower than `least`, of whose neighbours within `reach` bins
 * more than half lie `over` shades or more below. Writes row, bin and the median of the shades within reach; returns how
 * many.
 */
__attribute__((export_name("standouts"))) int standouts(const unsigned char *shades, int rows, int bins, int low, int high,
                                                        int reach, int least, int over, int *out, int most) {
  const v128_t lowest = wasm_i8x16_splat(least);
  int found = 0;
  for (int row = 0; row < rows; row++, shades += bins) {
    for (int at = low; at <= high; at += 16) {
      const v128_t here = wasm_v128_load(shades + at);
      int maxima = wasm_i8x16_bitmask(wasm_v128_and(
          wasm_u8x16_ge(here, lowest), wasm_v128_and(wasm_u8x16_ge(here, wasm_v128_load(shades + at - 1)),
                                                     wasm_u8x16_gt(here, wasm_v128_load(shades + at + 1)))));
      if (high + 1 - at < 16) maxima &= (1 << (high + 1 - at)) - 1;
      for (; maxima; maxima &= maxima - 1) {
        const int k = at + __builtin_ctz(maxima);
        const int from = k - reach < 1 ? 1 : k - reach, to = k + reach + 1 > bins ? bins : k + reach + 1;
        if (shades[k] < over) continue;
        if (atMost(shades, from, to, wasm_i8x16_splat(shades[k] - over)) <= (to - from) / 2) continue;
        if (found == most) return found;
        int median = 0;
        for (int bit = 128; bit; bit >>= 1)
          if (atMost(shades, from, to, wasm_i8x16_splat(median + bit - 1)) <= (to - from) / 2) median += bit;
        out[3 * found] = row;
        out[3 * found + 1] = k;
        out[3 * found + 2] = median;
        found++;
      }
    }
  }
  return found;
}

/* Sum of bins `from` to `to`, the last not included, of each row. */
__attribute__((export_name("bandSums"))) void bandSums(const float *power, int rows, int bins, int from, int to, float *out) {
  for (int row = 0; row < rows; row++, power += bins) {
    v128_t sum = wasm_f32x4_splat(0);
    int i = from;
    for (; i + 4 <= to; i += 4) sum = ADD(sum, wasm_v128_load(power + i));
    float s = wasm_f32x4_extract_lane(sum, 0) + wasm_f32x4_extract_lane(sum, 1) + wasm_f32x4_extract_lane(sum, 2) +
              wasm_f32x4_extract_lane(sum, 3);
    for (; i < to; i++) s += power[i];
    out[row] = s;
  }
}

/* Sum over i of x[i] * x[i + lag], for lags `from` to `to`. */
__attribute__((export_name("lagged"))) void lagged(const float *x, int n, int from, int to, float *out) {
  for (int lag = from; lag <= to; lag++) {
    v128_t a = wasm_f32x4_splat(0), b = a;
    int i = 0;
    for (; i + 8 + lag <= n; i += 8) {
      a = ADD(a, MUL(wasm_v128_load(x + i), wasm_v128_load(x + i + lag)));
      b = ADD(b, MUL(wasm_v128_load(x + i + 4), wasm_v128_load(x + i + 4 + lag)));
    }
    a = ADD(a, b);
    float s = wasm_f32x4_extract_lane(a, 0) + wasm_f32x4_extract_lane(a, 1) + wasm_f32x4_extract_lane(a, 2) +
              wasm_f32x4_extract_lane(a, 3);
    for (; i + lag < n; i++) s += x[i] * x[i + lag];
    out[lag - from] = s;
  }
}
