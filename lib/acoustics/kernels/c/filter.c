/* Second-order sections, transposed direct form II, in double precision. Plain twin: ../plain/filter.ts. */
#include <wasm_simd128.h>

/* A section is b0 b1 b2 a1 a2 z1 z2. */
enum { SECTION = 7 };

static inline double quiet(double z) { return z < 1e-30 && z > -1e-30 ? 0 : z; }

#define STEP(k)                                            \
  {                                                        \
    const double in = v;                                   \
    v = b0_##k * in + z1_##k;                              \
    z1_##k = b1_##k * in - a1_##k * v + z2_##k;            \
    z2_##k = b2_##k * in - a2_##k * v;                     \
  }
#define LOAD(k)                                                                                       \
  double *s_##k = sections + SECTION * k;                                                             \
  const double b0_##k = s_##k[0], b1_##k = s_##k[1], b2_##k = s_##k[2], a1_##k = s_##k[3], a2_##k = s_##k[4]; \
  double z1_##k = s_##k[5], z2_##k = s_##k[6];
#define SAVE(k)               \
  s_##k[5] = quiet(z1_##k);   \
  s_##k[6] = quiet(z2_##k);

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
