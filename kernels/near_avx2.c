/* SPDX-License-Identifier: LGPL-3.0-or-later
 * near_avx2.c: the kit for 256-bit vectors (AVX2), used where the processor has them.
 *
 * Eight particles of a leaf, or eight leaves, fill a vector; those that pass are packed by one
 * permutation taken from a table. */
#include "near.h"

#include <stddef.h>

#if defined(__x86_64__) && defined(__GNUC__) && !defined(WEND_PORTABLE)

#include <immintrin.h>

#define AVX2 __attribute__((target("avx2,popcnt")))

/* Table: for each mask of 8 bits the numbers of its set bits, ascending, a byte each. The rank
 * of bit b among the set ones is the count of those below. */
#define BIT(m, b) ((uint64_t)(m) >> (b)&1u)
#define PUT(m, b, rank) ((BIT(m, b) * (b)) << (8 * (rank)&63))
#define RANK1(m) (BIT(m, 0))
#define RANK2(m) (RANK1(m) + BIT(m, 1))
#define RANK3(m) (RANK2(m) + BIT(m, 2))
#define RANK4(m) (RANK3(m) + BIT(m, 3))
#define RANK5(m) (RANK4(m) + BIT(m, 4))
#define RANK6(m) (RANK5(m) + BIT(m, 5))
#define RANK7(m) (RANK6(m) + BIT(m, 6))
#define SET1(m)                                                                                \
  (PUT(m, 1, RANK1(m)) | PUT(m, 2, RANK2(m)) | PUT(m, 3, RANK3(m)) | PUT(m, 4, RANK4(m)) |     \
   PUT(m, 5, RANK5(m)) | PUT(m, 6, RANK6(m)) | PUT(m, 7, RANK7(m)))
#define SET4(m) SET1(m), SET1((m) + 1), SET1((m) + 2), SET1((m) + 3)
#define SET16(m) SET4(m), SET4((m) + 4), SET4((m) + 8), SET4((m) + 12)
#define SET64(m) SET16(m), SET16((m) + 16), SET16((m) + 32), SET16((m) + 48)
static const uint64_t SET[256] = {SET64(0), SET64(64), SET64(128), SET64(192)};

AVX2 static inline __m256i packing(unsigned mask) {
  return _mm256_cvtepu8_epi32(_mm_loadl_epi64((const __m128i *)&SET[mask]));
}

AVX2 static inline void pack_floats(float *to, const float *from, __m256i order) {
  _mm256_storeu_ps(to, _mm256_permutevar8x32_ps(_mm256_loadu_ps(from), order));
}

AVX2 static inline void pack_ints(int32_t *to, const int32_t *from, __m256i order) {
  const __m256i v = _mm256_loadu_si256((const __m256i *)from);
  _mm256_storeu_si256((__m256i *)to, _mm256_permutevar8x32_epi32(v, order));
}

/* Four rows x, y, z, H, less an origin and scaled, as columns of four. */
AVX2 static inline void four_rows(const double (*from)[4], __m256d origin, __m256d scale,
                                  __m128 column[4]) {
  for (int j = 0; j < 4; j++)
    column[j] =
        _mm256_cvtpd_ps(_mm256_mul_pd(_mm256_sub_pd(_mm256_loadu_pd(from[j]), origin), scale));
  _MM_TRANSPOSE4_PS(column[0], column[1], column[2], column[3]);
}

/* Eight rows as columns of eight. */
AVX2 static inline void eight_rows(const double (*from)[4], __m256d origin, __m256d scale,
                                   __m256 column[4]) {
  __m128 low[4], high[4];
  four_rows(from, origin, scale, low);
  four_rows(from + 4, origin, scale, high);
  for (int a = 0; a < 4; a++)
    column[a] = _mm256_insertf128_ps(_mm256_castps128_ps256(low[a]), high[a], 1);
}

/* wend_frame_slack of eight scaled radii. */
AVX2 static inline __m256 slacks(const wend_frame *f, __m256 q) {
  const __m256 radius = _mm256_max_ps(q, _mm256_set1_ps(1.0f));
  const __m256 s = _mm256_add_ps(radius, _mm256_set1_ps((float)f->spread));
  const __m256 unit = _mm256_add_ps(_mm256_mul_ps(_mm256_set1_ps(0x1.01p-19f), s),
                                    _mm256_set1_ps((float)f->round));
  const __m256 trusted = _mm256_cmp_ps(radius, _mm256_set1_ps((float)f->largest), _CMP_LT_OQ);
  return _mm256_blendv_ps(_mm256_set1_ps(INFINITY), _mm256_mul_ps(s, unit), trusted);
}

AVX2 static inline __m256i counting(int32_t from) {
  return _mm256_add_epi32(_mm256_set1_epi32(from), _mm256_setr_epi32(0, 1, 2, 3, 4, 5, 6, 7));
}

AVX2 static void load_avx2(wend_near *near, int32_t k) {
  const wend_frame *f = &near->frame;
  const int32_t begin = near->leaf[k] * WEND_LEAF, to = k * WEND_LEAF;
  const int32_t *name = near->places.name;
  __m256 column[4];
  eight_rows(near->places.place + begin, _mm256_loadu_pd(near->at[near->origin[k]]),
             _mm256_set1_pd(f->scale), column);
  const __m256 q = near->mutual ? column[3] : _mm256_setzero_ps();
  for (int a = 0; a < 3; a++) _mm256_storeu_ps(&near->x[a][to], column[a]);
  _mm256_storeu_ps(&near->h2[to], _mm256_mul_ps(q, q));
  _mm256_storeu_ps(&near->slack[to], slacks(f, q));
  _mm256_storeu_si256((__m256i *)&near->name[to],
                      name ? _mm256_loadu_si256((const __m256i *)(name + begin))
                           : counting(begin));
}

/* A box, or a place, and a squared radius in every lane. */
typedef struct wide_box {
  __m256 lo[3], hi[3], h2;
} wide_box;

AVX2 static inline wide_box widen(const float lo[3], const float hi[3], float h2) {
  wide_box b = {.h2 = _mm256_set1_ps(h2)};
  for (int a = 0; a < 3; a++) {
    b.lo[a] = _mm256_set1_ps(lo[a]);
    b.hi[a] = _mm256_set1_ps(hi[a]);
  }
  return b;
}

/* Which of eight boxes with supports reach another box. */
AVX2 static inline unsigned reach(const __m256 *lo, const __m256 *hi, __m256 reach2,
                                  __m256 slack, const wide_box *box) {
  __m256 r2 = _mm256_setzero_ps();
  for (int a = 0; a < 3; a++) {
    const __m256 below = _mm256_sub_ps(lo[a], box->hi[a]);
    const __m256 above = _mm256_sub_ps(box->lo[a], hi[a]);
    const __m256 d = _mm256_max_ps(_mm256_max_ps(below, above), _mm256_setzero_ps());
    r2 = _mm256_add_ps(r2, _mm256_mul_ps(d, d));
  }
  const __m256 over = _mm256_sub_ps(r2, _mm256_max_ps(reach2, box->h2));
  return ~(unsigned)_mm256_movemask_ps(_mm256_cmp_ps(over, slack, _CMP_GT_OQ)) & 0xffu;
}

/* Which of leaves k .. k + 7 reach a box. */
AVX2 static inline unsigned reaches(const wend_leaves *v, int32_t k, const wide_box *box) {
  __m256 lo[3], hi[3];
  for (int a = 0; a < 3; a++) {
    lo[a] = _mm256_loadu_ps(&v->lo[a][k]);
    hi[a] = _mm256_loadu_ps(&v->hi[a][k]);
  }
  const unsigned there = v->n - k < 8 ? (1u << (v->n - k)) - 1u : 0xffu;
  return there &
         reach(lo, hi, _mm256_loadu_ps(&v->reach2[k]), _mm256_loadu_ps(&v->slack[k]), box);
}

AVX2 static inline void put_floats(float *to, __m256 v, __m256i order) {
  _mm256_storeu_ps(to, _mm256_permutevar8x32_ps(v, order));
}

AVX2 static void collect_avx2(wend_near *near, int32_t leaf) {
  const wend_frame *f = &near->frame;
  wend_leaves *to = &near->leaves;
  const __m256d at = _mm256_loadu_pd(near->at[near->origins]);
  const __m256d scale = _mm256_set1_pd(f->scale);
  __m256 lo[4], hi[4];
  eight_rows((const double(*)[4])near->places.tree->lo + leaf, at, scale, lo);
  eight_rows((const double(*)[4])near->places.tree->hi + leaf, at, scale, hi);
  const __m256 q = near->mutual ? lo[3] : _mm256_setzero_ps(), q2 = _mm256_mul_ps(q, q);
  const __m256 slack = slacks(f, q);
  const wide_box box = widen(f->lo, f->hi, f->h2);
  const unsigned mask = reach(lo, hi, q2, slack, &box);
  const __m256i order = packing(mask);
  const int32_t n = to->n;
  for (int a = 0; a < 3; a++) {
    put_floats(&to->lo[a][n], lo[a], order);
    put_floats(&to->hi[a][n], hi[a], order);
  }
  put_floats(&to->reach2[n], q2, order);
  put_floats(&to->slack[n], slack, order);
  _mm256_storeu_si256((__m256i *)&to->slot[n], counting(n));
  _mm256_storeu_si256((__m256i *)&near->leaf[n],
                      _mm256_add_epi32(_mm256_set1_epi32(leaf), order));
  _mm256_storeu_si256((__m256i *)&near->origin[n], _mm256_set1_epi32(near->origins));
  to->n = n + __builtin_popcount(mask);
}

AVX2 static void narrow_avx2(const wend_leaves *restrict from, const float lo[3],
                             const float hi[3], float h2, wend_leaves *restrict to) {
  const wide_box box = widen(lo, hi, h2);
  int32_t m = 0;
  for (int32_t k = 0; k < from->n; k += 8) {
    const unsigned mask = reaches(from, k, &box);
    const __m256i order = packing(mask);
    for (int a = 0; a < 3; a++) {
      pack_floats(&to->lo[a][m], &from->lo[a][k], order);
      pack_floats(&to->hi[a][m], &from->hi[a][k], order);
    }
    pack_floats(&to->reach2[m], &from->reach2[k], order);
    pack_floats(&to->slack[m], &from->slack[k], order);
    pack_ints(&to->slot[m], &from->slot[k], order);
    m += __builtin_popcount(mask);
  }
  to->n = m;
}

AVX2 static int32_t choose_avx2(const wend_leaves *leaves, const wend_member *m,
                                int32_t *restrict list) {
  const wide_box box = widen(m->x, m->x, m->h2);
  int32_t n = 0;
  for (int32_t k = 0; k < leaves->n; k += 8) {
    const unsigned mask = reaches(leaves, k, &box);
    pack_ints(list + n, &leaves->slot[k], packing(mask));
    n += __builtin_popcount(mask);
  }
  return n;
}

AVX2 static int32_t sieve_avx2(const wend_near *near, const wend_member *m, int32_t n,
                               const int32_t *restrict slot, int32_t *restrict hits) {
  const __m256 at[3] = {_mm256_set1_ps(m->x[0]), _mm256_set1_ps(m->x[1]),
                        _mm256_set1_ps(m->x[2])};
  const __m256 own = _mm256_set1_ps(m->h2), sign = _mm256_set1_ps(-0.0f);
  int32_t count = 0;
  for (int32_t k = 0; k < n; k++) {
    const int32_t j = slot[k] * WEND_LEAF;
    __m256 r2 = _mm256_setzero_ps();
    for (int a = 0; a < 3; a++) {
      const __m256 x = _mm256_sub_ps(_mm256_loadu_ps(&near->x[a][j]), at[a]);
      r2 = _mm256_add_ps(r2, _mm256_mul_ps(x, x));
    }
    const __m256 d = _mm256_sub_ps(r2, _mm256_max_ps(_mm256_loadu_ps(&near->h2[j]), own));
    const __m256 far =
        _mm256_cmp_ps(_mm256_andnot_ps(sign, d), _mm256_loadu_ps(&near->slack[j]), _CMP_GT_OQ);
    const unsigned close = ~(unsigned)_mm256_movemask_ps(far) & 0xffu;
    unsigned inside = (unsigned)_mm256_movemask_ps(d);
    if (close) inside = wend_near_decide(near, m, slot[k], inside, close);
    pack_ints(hits + count, &near->name[j], packing(inside));
    count += __builtin_popcount(inside);
  }
  return count;
}

/* Squares of the four coordinates' differences, nearest images, of a place from another. */
typedef struct wide_domain {
  __m256d period, half;
} wide_domain;

AVX2 static inline __m256d squares(const wide_domain *d, const double *place, __m256d from) {
  const __m256d dx = _mm256_sub_pd(_mm256_loadu_pd(place), from);
  const __m256d minus = _mm256_sub_pd(_mm256_setzero_pd(), d->half);
  const __m256d up = _mm256_and_pd(_mm256_cmp_pd(dx, d->half, _CMP_GT_OQ), d->period);
  const __m256d down = _mm256_and_pd(_mm256_cmp_pd(dx, minus, _CMP_LT_OQ), d->period);
  const __m256d x = _mm256_sub_pd(dx, _mm256_sub_pd(up, down));
  return _mm256_mul_pd(x, x);
}

/* Distances of four places: x^2 + y^2 + z^2 in this order. */
AVX2 static inline __m256d four_distances(const wide_domain *d, const double *p0,
                                          const double *p1, const double *p2, const double *p3,
                                          __m256d from) {
  const __m256d a = squares(d, p0, from), b = squares(d, p1, from);
  const __m256d c = squares(d, p2, from), e = squares(d, p3, from);
  const __m256d xz_low = _mm256_unpacklo_pd(a, b), y_low = _mm256_unpackhi_pd(a, b);
  const __m256d xz_high = _mm256_unpacklo_pd(c, e), y_high = _mm256_unpackhi_pd(c, e);
  const __m256d x = _mm256_permute2f128_pd(xz_low, xz_high, 0x20);
  const __m256d z = _mm256_permute2f128_pd(xz_low, xz_high, 0x31);
  const __m256d y = _mm256_permute2f128_pd(y_low, y_high, 0x20);
  return _mm256_sqrt_pd(_mm256_add_pd(_mm256_add_pd(x, y), z));
}

AVX2 static void distances_avx2(const wend_places *p, int32_t self, int32_t n,
                                const int32_t *restrict number, double *restrict r) {
  const wend_domain *domain = p->domain;
  const wide_domain d = {
      _mm256_setr_pd(domain->period[0], domain->period[1], domain->period[2], 0.0),
      _mm256_setr_pd(domain->half[0], domain->half[1], domain->half[2], INFINITY)};
  const __m256d from = _mm256_loadu_pd(p->place[self]);
  int32_t k = 0;
  for (; k + 4 <= n; k += 4)
    _mm256_storeu_pd(r + k,
                     four_distances(&d, p->place[number[k]], p->place[number[k + 1]],
                                    p->place[number[k + 2]], p->place[number[k + 3]], from));
  for (; k < n; k++) {
    const double *one = p->place[number[k]];
    r[k] = _mm256_cvtsd_f64(four_distances(&d, one, one, one, one, from));
  }
}

const wend_near_kit *wend_near_kit_avx2(void) {
  static const wend_near_kit kit = {
      "avx2", collect_avx2, load_avx2, narrow_avx2, choose_avx2, sieve_avx2, distances_avx2,
  };
  __builtin_cpu_init();
  return __builtin_cpu_supports("avx2") && __builtin_cpu_supports("popcnt") ? &kit : NULL;
}

#else

const wend_near_kit *wend_near_kit_avx2(void) { return NULL; }

#endif
