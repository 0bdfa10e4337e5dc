/* Second-order sections, transposed direct form II, in double precision. Plain twin: ../plain/filter.ts. */
#include <wasm_simd128.h>

/* A section is b0 b1 b2 a1 a2 z1 z2. What does not wait for the output is added first: the sum is the longest wait. */
enum { SECTION = 7 };

static inline double quiet(double z) { return z < 1e-30 && z > -1e-30 ? 0 : z; }

#define STEP(k)                                            \
  {                                                        \
    const double in = v;                                   \
    v = b0_##k * in + z1_##k;                              \
    z1_##k = (b1_##k * in + z2_##k) - a1_##k * v;          \
    z2_##k = b2_##k * in - a2_##k * v;                     \
  }
#define LOAD(k)                                                                                       \
  double *s_##k = sections + SECTION * k;                                                             \
  const double b0_##k = s_##k[0], b1_##k = s_##k[1], b2_##k = s_##k[2], a1_##k = s_##k[3], a2_##k = s_##k[4]; \
  double z1_##k = s_##k[5], z2_##k = s_##k[6];
#define SAVE(k)               \
  s_##k[5] = quiet(z1_##k);   \
  s_##k[6] = quiet(z2_##k);

static inline v128_t hush(v128_t z) {
  return wasm_v128_and(z, wasm_f64x2_ge(wasm_f64x2_abs(z), wasm_f64x2_splat(1e-30)));
}

#define BOTH(k)                                                                                               \
  {                                                                                                           \
    const v128_t in = v;                                                                                      \
    v = wasm_f64x2_add(wasm_f64x2_mul(p##k[0], in), z1##k);                                                   \
    z1##k = wasm_f64x2_sub(wasm_f64x2_add(wasm_f64x2_mul(p##k[1], in), z2##k), wasm_f64x2_mul(p##k[3], v));   \
    z2##k = wasm_f64x2_sub(wasm_f64x2_mul(p##k[2], in), wasm_f64x2_mul(p##k[4], v));                          \
  }

/* Two chains of three sections on one input, a lane each: `sections` holds the values of both side by side. */
__attribute__((export_name("twins"))) void twins(v128_t *sections, const float *x, float *first, float *second, int n) {
  v128_t *p0 = sections, *p1 = p0 + SECTION, *p2 = p1 + SECTION;
  v128_t z10 = p0[5], z20 = p0[6], z11 = p1[5], z21 = p1[6], z12 = p2[5], z22 = p2[6];
  for (int i = 0; i < n; i++) {
    v128_t v = wasm_f64x2_splat(x[i]);
    BOTH(0) BOTH(1) BOTH(2)
    first[i] = (float)wasm_f64x2_extract_lane(v, 0);
    second[i] = (float)wasm_f64x2_extract_lane(v, 1);
  }
  p0[5] = hush(z10);
  p0[6] = hush(z20);
  p1[5] = hush(z11);
  p1[6] = hush(z21);
  p2[5] = hush(z12);
  p2[6] = hush(z22);
}

/* Two or three sections one behind the other: the stages of neighbouring samples overlap in the processor. */
__attribute__((export_name("cascade"))) void cascade(double *sections, int count, const float *x, float *out, int n) {
  if (count == 2) {
    LOAD(0) LOAD(1)
    for (int i = 0; i < n; i++) {
      double v = x[i];
      STEP(0) STEP(1)
      out[i] = (float)v;
    }
    SAVE(0) SAVE(1)
  } else if (count == 3) {
    LOAD(0) LOAD(1) LOAD(2)
    for (int i = 0; i < n; i++) {
      double v = x[i];
      STEP(0) STEP(1) STEP(2)
      out[i] = (float)v;
    }
    SAVE(0) SAVE(1) SAVE(2)
  }
}
