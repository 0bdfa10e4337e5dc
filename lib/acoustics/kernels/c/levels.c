/* Passes over samples at the file's own rate: extremes, sums, bends. Meanings and plain twins: ../plain/levels.ts. */
#include <wasm_simd128.h>

static inline float least(v128_t v) {
  v128_t w = wasm_f32x4_pmin(v, wasm_i32x4_shuffle(v, v, 2, 3, 0, 1));
  w = wasm_f32x4_pmin(w, wasm_i32x4_shuffle(w, w, 1, 0, 3, 2));
  return wasm_f32x4_extract_lane(w, 0);
}

static inline float largest(v128_t v) {
  v128_t w = wasm_f32x4_pmax(v, wasm_i32x4_shuffle(v, v, 2, 3, 0, 1));
  w = wasm_f32x4_pmax(w, wasm_i32x4_shuffle(w, w, 1, 0, 3, 2));
  return wasm_f32x4_extract_lane(w, 0);
}

static inline float total(v128_t v) {
  v128_t w = wasm_f32x4_add(v, wasm_i32x4_shuffle(v, v, 2, 3, 0, 1));
  w = wasm_f32x4_add(w, wasm_i32x4_shuffle(w, w, 1, 0, 3, 2));
  return wasm_f32x4_extract_lane(w, 0);
}

__attribute__((export_name("stretches"))) void stretches(const float *x, int count, int length, float *out) {
  for (int s = 0; s < count; s++, x += length, out += 4) {
    const float first = x[0];
    const v128_t from = wasm_f32x4_splat(first);
    v128_t low = from, high = from;
    v128_t sum = wasm_f32x4_splat(0), squares = sum, sum2 = sum, squares2 = sum;
    int i = 0;
    for (; i + 8 <= length; i += 8) {
      const v128_t a = wasm_v128_load(x + i), b = wasm_v128_load(x + i + 4);
      low = wasm_f32x4_pmin(low, wasm_f32x4_pmin(a, b));
      high = wasm_f32x4_pmax(high, wasm_f32x4_pmax(a, b));
      const v128_t c = wasm_f32x4_sub(a, from), d = wasm_f32x4_sub(b, from);
      sum = wasm_f32x4_add(sum, c);
      sum2 = wasm_f32x4_add(sum2, d);
      squares = wasm_f32x4_add(squares, wasm_f32x4_mul(c, c));
      squares2 = wasm_f32x4_add(squares2, wasm_f32x4_mul(d, d));
    }
    float min = least(low), max = largest(high);
    float s1 = total(wasm_f32x4_add(sum, sum2)), s2 = total(wasm_f32x4_add(squares, squares2));
    for (; i < length; i++) {
      const float a = x[i], d = a - first;
      if (a < min) min = a;
      if (a > max) max = a;
      s1 += d;
      s2 += d * d;
    }
    out[0] = min;
    out[1] = max;
    out[2] = s1;
    out[3] = s2;
  }
}

__attribute__((export_name("energies"))) void energies(const float *x, int count, int length, float *out) {
  for (int s = 0; s < count; s++, x += length) {
    v128_t squares = wasm_f32x4_splat(0);
    int i = 0;
    for (; i + 4 <= length; i += 4) {
      const v128_t a = wasm_v128_load(x + i);
      squares = wasm_f32x4_add(squares, wasm_f32x4_mul(a, a));
    }
    float sum = total(squares);
    for (; i < length; i++) sum += x[i] * x[i];
    out[s] = sum;
  }
}

/* `bucket` is a multiple of 8. */
__attribute__((export_name("extremes"))) void extremes(const float *x, int count, int bucket, float *out) {
  for (int b = 0; b < count; b++, x += bucket) {
    v128_t low = wasm_v128_load(x), high = low;
    v128_t low2 = wasm_v128_load(x + 4), high2 = low2;
    for (int i = 8; i < bucket; i += 8) {
      const v128_t a = wasm_v128_load(x + i), c = wasm_v128_load(x + i + 4);
      low = wasm_f32x4_pmin(low, a);
      high = wasm_f32x4_pmax(high, a);
      low2 = wasm_f32x4_pmin(low2, c);
      high2 = wasm_f32x4_pmax(high2, c);
    }
    out[2 * b] = least(wasm_f32x4_pmin(low, low2));
    out[2 * b + 1] = largest(wasm_f32x4_pmax(high, high2));
  }
}

/* x[-1] and x[n] are read. Runs of `run` samples, the first of `first`, the last of what is left. */
__attribute__((export_name("bends"))) int bends(const float *x, int n, int first, int run, float *out) {
  int runs = 0;
  for (int at = 0, end = first; at < n; at = end, end += run, runs++) {
    if (end > n) end = n;
    v128_t sum = wasm_f32x4_splat(0), most = sum;
    int i = at;
    for (; i + 4 <= end; i += 4) {
      const v128_t here = wasm_v128_load(x + i);
      const v128_t beside = wasm_f32x4_add(wasm_v128_load(x + i - 1), wasm_v128_load(x + i + 1));
      const v128_t bend = wasm_f32x4_abs(wasm_f32x4_sub(wasm_f32x4_add(here, here), beside));
      sum = wasm_f32x4_add(sum, bend);
      most = wasm_f32x4_pmax(most, bend);
    }
    float s = total(sum), m = largest(most);
    for (; i < end; i++) {
      float bend = x[i] + x[i] - x[i - 1] - x[i + 1];
      if (bend < 0) bend = -bend;
      s += bend;
      if (bend > m) m = bend;
    }
    out[2 * runs] = s;
    out[2 * runs + 1] = m;
  }
  return runs;
}

/* Interleaved 16-bit codes to one channel; for one channel eight at a time. */
__attribute__((export_name("spread16"))) void spread16(const short *codes, int channels, int frames, float *out) {
  const v128_t scale = wasm_f32x4_splat(1.0f / 32768.0f);
  int i = 0;
  if (channels == 1)
    for (; i + 8 <= frames; i += 8) {
      const v128_t c = wasm_v128_load(codes + i);
      wasm_v128_store(out + i, wasm_f32x4_mul(wasm_f32x4_convert_i32x4(wasm_i32x4_extend_low_i16x8(c)), scale));
      wasm_v128_store(out + i + 4, wasm_f32x4_mul(wasm_f32x4_convert_i32x4(wasm_i32x4_extend_high_i16x8(c)), scale));
    }
  for (; i < frames; i++) out[i] = (float)codes[i * channels] * (1.0f / 32768.0f);
}

static inline v128_t weighed(v128_t sum, v128_t tap, const float *x) {
  return wasm_f32x4_add(sum, wasm_f32x4_mul(tap, wasm_v128_load(x)));
}

/*
 * Weighed sums of a FIR filter; `taps` is padded with zeros to a multiple of 4, and x may be read that far. Four sums at
 * once share the loads of the taps and the adding up across lanes.
 */
__attribute__((export_name("dots"))) void dots(const float *taps, int length, const float *x, int step, int count, float *out) {
  int k = 0;
  for (; k + 4 <= count; k += 4, x += 4 * step) {
    v128_t a = wasm_f32x4_splat(0), b = a, c = a, d = a;
    for (int j = 0; j < length; j += 4) {
      const v128_t tap = wasm_v128_load(taps + j);
      a = weighed(a, tap, x + j);
      b = weighed(b, tap, x + step + j);
      c = weighed(c, tap, x + 2 * step + j);
      d = weighed(d, tap, x + 3 * step + j);
    }
    const v128_t ab = wasm_f32x4_add(wasm_i32x4_shuffle(a, b, 0, 4, 1, 5), wasm_i32x4_shuffle(a, b, 2, 6, 3, 7));
    const v128_t cd = wasm_f32x4_add(wasm_i32x4_shuffle(c, d, 0, 4, 1, 5), wasm_i32x4_shuffle(c, d, 2, 6, 3, 7));
    wasm_v128_store(out + k, wasm_f32x4_add(wasm_i64x2_shuffle(ab, cd, 0, 2), wasm_i64x2_shuffle(ab, cd, 1, 3)));
  }
  for (; k < count; k++, x += step) {
    v128_t a = wasm_f32x4_splat(0);
    for (int j = 0; j < length; j += 4) a = weighed(a, wasm_v128_load(taps + j), x + j);
    out[k] = total(a);
  }
}

/* How many of n values are at most `limit` in magnitude. */
__attribute__((export_name("countBelow"))) int countBelow(const float *x, int n, float limit) {
  const v128_t bound = wasm_f32x4_splat(limit);
  v128_t count = wasm_i32x4_splat(0);
  int i = 0;
  for (; i + 4 <= n; i += 4)
    count = wasm_i32x4_sub(count, wasm_f32x4_le(wasm_f32x4_abs(wasm_v128_load(x + i)), bound));
  int c = wasm_i32x4_extract_lane(count, 0) + wasm_i32x4_extract_lane(count, 1) +
          wasm_i32x4_extract_lane(count, 2) + wasm_i32x4_extract_lane(count, 3);
  for (; i < n; i++) {
    const float a = x[i] < 0 ? -x[i] : x[i];
    if (a <= limit) c++;
  }
  return c;
}

/* Largest magnitude of each of `count` stretches. */
__attribute__((export_name("magnitudes"))) void magnitudes(const float *x, int count, int length, float *out) {
  for (int s = 0; s < count; s++, x += length) {
    v128_t most = wasm_f32x4_splat(0);
    int i = 0;
    for (; i + 4 <= length; i += 4) most = wasm_f32x4_pmax(most, wasm_f32x4_abs(wasm_v128_load(x + i)));
    float m = largest(most);
    for (; i < length; i++) {
      const float a = x[i] < 0 ? -x[i] : x[i];
      if (a > m) m = a;
    }
    out[s] = m;
  }
}

/*
 * Largest and smallest of the sound between samples, by four polyphase filters of 12 taps; only about samples of at
 * least `gate` that are no smaller than their neighbours. taps: 12 vectors, one lane a phase. x is read from at - 6 to at + n + 5.
 */
__attribute__((export_name("betweenSamples"))) void betweenSamples(const float *taps, const float *x, int n, float gate, float *out) {
  v128_t high = wasm_f32x4_splat(out[0]), low = wasm_f32x4_splat(out[1]);
  const v128_t bound = wasm_f32x4_splat(gate);
  for (int i = 0; i < n; i++) {
    if ((i & 3) == 0)
      while (i + 4 <= n && !wasm_v128_any_true(wasm_f32x4_ge(wasm_f32x4_abs(wasm_v128_load(x + i)), bound))) i += 4;
    if (i >= n) break;
    const float here = x[i] < 0 ? -x[i] : x[i];
    if (here < gate) continue;
    const float before = x[i - 1] < 0 ? -x[i - 1] : x[i - 1], next = x[i + 1] < 0 ? -x[i + 1] : x[i + 1];
    if (here < before || here < next) continue;
    for (int side = -1; side <= 0; side++) {
      const float *from = x + i + side - 5;
      v128_t sum = wasm_f32x4_mul(wasm_v128_load(taps), wasm_f32x4_splat(from[0]));
      for (int j = 1; j < 12; j++)
        sum = wasm_f32x4_add(sum, wasm_f32x4_mul(wasm_v128_load(taps + 4 * j), wasm_f32x4_splat(from[j])));
      high = wasm_f32x4_pmax(high, sum);
      low = wasm_f32x4_pmin(low, sum);
    }
  }
  out[0] = largest(high);
  out[1] = least(low);
}
