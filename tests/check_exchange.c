/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_exchange.c: the three passes against row-by-row formulas to the bit; linear fields;
 * conservation; and the bounds that the limiter promises, on thousands of random states. */
#include "exchange.h"

#include "cloud.h"
#include "sum.h"
#include "web.h"

#include <check.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

static const web_plan plans[] = {
    {2, 3, 12, 0.2, 2.6, 0}, {2, 3, 13, 1.0, 2.6, 0}, {2, 1, 12, 0.5, 2.6, 0},
    {3, 7, 6, 0.2, 2.3, 0},  {3, 7, 6, 1.0, 2.3, 0},  {3, 3, 6, 0.5, 2.3, 0},
};
enum { PLANS = sizeof plans / sizeof plans[0] };

static const double ulp = 0x1p-24; /* unit roundoff of float */

/* ---- everything the passes work on ---- */

typedef struct flow {
  web *w;
  bool along;
  int width;
  float *slope, *alpha, *beta, *gradient[3], *kept;
  double *full, *both; /* [rows] sums of a and of a + s */
  double *kappa_along; /* [rows] */
  double *state;       /* [rows][width] */
  float *anti;         /* [entries] */
  double (*ratio)[2];
  double *rate;
  double step; /* forward-Euler limit */
} flow;

/* Coefficients anew, from the present fields of the web. */
static void flow_prepare(flow *f) {
  web *w = f->w;
  const wend_operator_source source = web_operator(w);
  wend_operator_low_order(&w->l.pairs, w->l.all, &source, &w->faces, f->kept, f->full, f->both);
  wend_operator_slope(&w->l.pairs, w->l.all, &source, w->faces.arm, f->slope);
  wend_operator_along(&w->l.pairs, w->l.all, source.field, w->faces.area, f->alpha, f->beta);
  wend_operator_gradient(&w->l.pairs, w->l.all, &source, w->faces.arm, f->gradient);
  double fastest = 0;
  for (int32_t i = 0; i < w->l.n; i++) {
    f->kappa_along[i] = w->kappa[i][0];
    fastest = fmax(fastest, f->both[i] / w->volume[i]);
  }
  f->step = 1 / fastest;
}

static flow flow_create(web *w, bool along) {
  const size_t n = (size_t)w->l.n;
  flow f = {.w = w, .along = along, .width = along ? 2 : 4};
  float **const column[] = {&f.slope,       &f.alpha,       &f.beta,       &f.kept,
                            &f.gradient[0], &f.gradient[1], &f.gradient[2]};
  for (size_t k = 0; k < sizeof column / sizeof *column; k++) *column[k] = web_column(w);
  f.full = calloc(n, sizeof *f.full);
  f.both = calloc(n, sizeof *f.both);
  f.kappa_along = calloc(n, sizeof *f.kappa_along);
  f.state = calloc(n * 4, sizeof *f.state);
  f.anti = calloc((size_t)web_entries(w) + 1, sizeof *f.anti);
  f.ratio = calloc(n, sizeof *f.ratio);
  f.rate = calloc(n, sizeof *f.rate);
  flow_prepare(&f);
  return f;
}

static void flow_destroy(flow *f) {
  float *const column[] = {f->slope,       f->alpha,       f->beta,       f->kept,
                           f->gradient[0], f->gradient[1], f->gradient[2]};
  for (size_t k = 0; k < sizeof column / sizeof *column; k++) free(column[k]);
  free(f->full);
  free(f->both);
  free(f->kappa_along);
  free(f->state);
  free(f->anti);
  free(f->ratio);
  free(f->rate);
}

static double *value(const flow *f, int32_t i) { return &f->state[(int64_t)i * f->width]; }

/* The three passes of the library. */
static void run(flow *f, bool limited) {
  const wend_pairs *p = &f->w->l.pairs;
  const wend_slices all = f->w->l.all;
  if (f->along) {
    wend_exchange_flux_along(p, all, f->slope, f->kappa_along, (double(*)[2])f->state);
    wend_exchange_ratios_along(p, all, f->alpha, f->beta, f->kept, f->full,
                               (const double(*)[2])f->state, f->anti, f->ratio);
  } else {
    wend_exchange_flux_full(p, all, f->gradient, (const double(*)[3])f->w->field,
                            (const double(*)[2])f->w->kappa, (double(*)[4])f->state);
    wend_exchange_ratios_full(p, all, f->w->faces.area, f->kept, f->full,
                              (const double(*)[4])f->state, f->anti, f->ratio);
  }
  for (int32_t i = 0; i < f->w->l.n && !limited; i++) f->ratio[i][0] = f->ratio[i][1] = 1;
  wend_exchange_rate(p, all, f->kept, f->state, f->width, f->anti, (const double(*)[2])f->ratio,
                     f->rate);
}

/* ---- random states ---- */

/* Energies of a trial: smooth, over 12 decades with regions at 0, or a patch of few values. */
static void energise(flow *f, uint64_t seed) {
  const uint64_t kind = seed % 3;
  uint64_t state = seed;
  const double edge = 2 * cloud_random(&state) - 1;
  for (int32_t i = 0; i < f->w->l.n; i++) {
    const double *x = f->w->l.place[i], u = cloud_random(&state);
    if (kind == 0) *value(f, i) = 1 + 0.5 * sin(3 * x[0] + 2 * x[1] + 6 * edge);
    if (kind == 1) *value(f, i) = x[1] > edge ? 0 : pow(10, 12 * (u - 1));
    if (kind == 2) *value(f, i) = fabs(x[0] - edge) < 0.5 ? 12 : u < 0.05 ? 0 : 10;
  }
}

/* ---- the passes by plain formulas ---- */

/* What a row does in pass 2 and 3, in list order: the same bits are asked for. */
static double flux_of(const flow *f, int32_t i, int64_t k) {
  const double *own = value(f, i), *other = value(f, f->w->l.pairs.index[k]);
  if (f->along) return f->alpha[k] * own[1] + f->beta[k] * other[1];
  float *const *a = f->w->faces.area;
  return (a[0][k] * (own[1] + other[1]) + a[1][k] * (own[2] + other[2]) +
          a[2][k] * (own[3] + other[3])) /
         2;
}

static void fluxes_by_formula(const flow *f, int32_t i, double q[3]) {
  const wend_pairs *p = &f->w->l.pairs;
  const double *b = f->w->field[i], *kappa = f->w->kappa[i];
  double g[3] = {0}, along = 0;
  for (int32_t m = 0; m < p->count[i]; m++) {
    const int64_t k = wend_pairs_entry(p, i, m);
    const double rise = *value(f, p->index[k]) - *value(f, i);
    along += f->slope[k] * rise;
    for (int d = 0; d < 3; d++) g[d] += f->gradient[d][k] * rise;
  }
  q[0] = -kappa[0] * along;
  if (f->along) return;
  const double g_b = b[0] * g[0] + b[1] * g[1] + b[2] * g[2];
  for (int d = 0; d < 3; d++) q[d] = -((kappa[0] - kappa[1]) * g_b * b[d] + kappa[1] * g[d]);
}

static void ratios_by_formula(const flow *f, int32_t i, double r[2]) {
  const wend_pairs *p = &f->w->l.pairs;
  double in = 0, out = 0, top = 0, bottom = 0;
  for (int32_t m = 0; m < p->count[i]; m++) {
    const int64_t k = wend_pairs_entry(p, i, m);
    const double rise = *value(f, p->index[k]) - *value(f, i);
    const float t = (float)-(flux_of(f, i, k) + f->kept[k] * rise);
    if (t > 0) in += t;
    if (t < 0) out += t;
    top = fmax(top, rise);
    bottom = fmin(bottom, rise);
  }
  r[0] = in > 0 ? fmin(1, f->full[i] * top / in) : 1;
  r[1] = out < 0 ? fmin(1, f->full[i] * bottom / out) : 1;
}

/* What enters i from j: s (e_j - e_i) + C t. */
static double enters(const flow *f, int32_t i, int64_t k) {
  const int32_t j = f->w->l.pairs.index[k];
  const double rise = *value(f, j) - *value(f, i);
  const float t = (float)-(flux_of(f, i, k) + f->kept[k] * rise);
  const double c =
      t > 0 ? fmin(f->ratio[i][0], f->ratio[j][1]) : fmin(f->ratio[i][1], f->ratio[j][0]);
  return f->kept[k] * rise + c * t;
}

START_TEST(passes_follow_the_formulas_to_the_bit) {
  web w = web_create(&plans[_i / 2], 1);
  web_close(&w);
  web_magnetise(&w, _i % 2 == 1, 1);
  flow f = flow_create(&w, _i % 2 == 0);
  for (uint64_t seed = 0; seed < 3; seed++) {
    energise(&f, seed);
    run(&f, true);
    for (int32_t i = 0; i < w.l.n; i++) {
      double q[3], r[2], rate = 0;
      fluxes_by_formula(&f, i, q);
      ratios_by_formula(&f, i, r);
      for (int d = 0; d < f.width - 1; d++) ck_assert(value(&f, i)[1 + d] == q[d]);
      for (int d = 0; d < 2; d++) {
        ck_assert(f.ratio[i][d] == r[d]);
        ck_assert(r[d] >= 0 && r[d] <= 1);
      }
      for (int32_t m = 0; m < w.l.pairs.count[i]; m++)
        rate += enters(&f, i, wend_pairs_entry(&w.l.pairs, i, m));
      ck_assert(f.rate[i] == rate);
    }
  }
  flow_destroy(&f);
  web_destroy(&w);
}
END_TEST

START_TEST(padding_and_slices_change_no_bit) {
  web_plan padded = plans[_i / 2];
  padded.extra = 4;
  web w = web_create(&plans[_i / 2], 2), v = web_create(&padded, 2);
  web *const both[2] = {&w, &v};
  flow f[2];
  for (int k = 0; k < 2; k++) {
    web_magnetise(both[k], _i % 2 == 1, 2);
    f[k] = flow_create(both[k], _i % 2 == 0);
    energise(&f[k], 1);
    run(&f[k], true);
  }
  ck_assert(memcmp(f[0].rate, f[1].rate, (size_t)w.l.n * sizeof(double)) == 0);
  /* One slice at a time, last one first. */
  memset(f[1].rate, 0, (size_t)v.l.n * sizeof(double));
  for (int32_t s = v.l.pairs.slices - 1; s >= 0; s--)
    wend_exchange_rate(&v.l.pairs, (wend_slices){1, &s}, f[1].kept, f[1].state, f[1].width,
                       f[1].anti, (const double(*)[2])f[1].ratio, f[1].rate);
  ck_assert(memcmp(f[0].rate, f[1].rate, (size_t)w.l.n * sizeof(double)) == 0);
  for (int k = 0; k < 2; k++) {
    flow_destroy(&f[k]);
    web_destroy(both[k]);
  }
}
END_TEST

/* ---- both ends of a pair ---- */

/* The sum of what crosses all pairs, both ways, is exactly 0; rows add it up with rounding:
 * 1e-15 of all that moves. */
START_TEST(what_leaves_one_end_enters_the_other) {
  web w = web_create(&plans[_i / 2], 3);
  web_close(&w);
  web_magnetise(&w, _i % 2 == 1, 3);
  flow f = flow_create(&w, _i % 2 == 0);
  for (uint64_t seed = 0; seed < 3; seed++) {
    energise(&f, seed);
    run(&f, true);
    wend_sum pairs, rows;
    double moved = 0;
    wend_sum_reset(&pairs);
    wend_sum_reset(&rows);
    for (int32_t i = 0; i < w.l.n; i++)
      for (int32_t m = 0; m < w.l.pairs.count[i]; m++) {
        const int64_t k = wend_pairs_entry(&w.l.pairs, i, m), twin = web_twin(&w, i, k);
        const double in = enters(&f, i, k);
        ck_assert(f.anti[k] == -f.anti[twin]);
        ck_assert(in == -enters(&f, w.l.pairs.index[k], twin));
        wend_sum_add(&pairs, 1, &in, 1);
        moved += fabs(in);
      }
    wend_sum_add(&rows, w.l.n, f.rate, 1);
    ck_assert(wend_sum_value(&pairs) == 0);
    ck_assert_double_gt(moved, 0);
    ck_assert_double_le(fabs(wend_sum_value(&rows)), 1e-15 * moved);
  }
  flow_destroy(&f);
  web_destroy(&w);
}
END_TEST

/* ---- linear fields ---- */

/* e = 3 + slope.x in a box that is not periodic: Q is the same everywhere, and where faces
 * close nothing stays behind. Rounding of c_ij and A_ij to float: 4 ulp of the magnitudes. */
START_TEST(linear_fields_stay) {
  static const web_plan open[] = {{2, 0, 14, 0.3, 2.6, 0}, {3, 0, 8, 0.3, 2.3, 0}};
  static const double slope[3] = {1.5, -0.7, 0.4};
  web w = web_create(&open[_i % 2], 4);
  web_close(&w);
  for (int32_t i = 0; i < w.l.n; i++) {
    const double b[3] = {0.6, _i % 2 == 0 ? 0.8 : 0.48, _i % 2 == 0 ? 0 : 0.64};
    memcpy(w.field[i], b, sizeof b);
    w.kappa[i][0] = 0.7;
    w.kappa[i][1] = _i / 2 == 0 ? 0 : 0.2;
  }
  flow f = flow_create(&w, _i / 2 == 0);
  for (int32_t i = 0; i < w.l.n; i++) {
    *value(&f, i) = 3;
    for (int a = 0; a < 3; a++) *value(&f, i) += slope[a] * w.l.place[i][a];
  }
  run(&f, false);
  int inside = 0;
  for (int32_t i = 0; i < w.l.n; i++) {
    double size = 0;
    for (int32_t m = 0; m < w.l.pairs.count[i]; m++) {
      const int64_t k = wend_pairs_entry(&w.l.pairs, i, m);
      for (int a = 0; a < 3; a++) size += fabs(w.faces.area[a][k]);
    }
    if (w.surface[i]) continue;
    inside++;
    ck_assert_double_le(fabs(f.rate[i]), 4 * ulp * size * 1.5);
  }
  ck_assert_int_gt(inside, 60);
  flow_destroy(&f);
  web_destroy(&w);
}
END_TEST

/* ---- along the field and in full ---- */

/* With kappa_perp = 0 both forms compute the same from columns rounded differently: alpha and
 * beta hold A.b, d holds b.c. 16 ulp of what moves through i and its neighbours. */
START_TEST(both_forms_agree_without_kappa_perp) {
  web w = web_create(&plans[_i], 5);
  web_close(&w);
  web_magnetise(&w, false, 5);
  flow along = flow_create(&w, true), full = flow_create(&w, false);
  for (uint64_t seed = 0; seed < 6; seed++) {
    for (int limited = 0; limited < 2; limited++) {
      energise(&along, seed);
      energise(&full, seed);
      run(&along, limited);
      run(&full, limited);
      double largest = 0;
      for (int64_t k = 0; k < web_entries(&w); k++)
        largest = fmax(largest, fabs(along.anti[k]));
      for (int32_t i = 0; i < w.l.n; i++)
        ck_assert_double_le(fabs(along.rate[i] - full.rate[i]), 16 * ulp * largest);
    }
  }
  flow_destroy(&along);
  flow_destroy(&full);
  web_destroy(&w);
}
END_TEST

/* ---- bounds ---- */

/* Largest excess over the extrema of i and its neighbours after a forward-Euler step at the
 * limit, over the largest of them. */
static double excess(const flow *f) {
  const wend_pairs *p = &f->w->l.pairs;
  double worst = 0;
  for (int32_t i = 0; i < f->w->l.n; i++) {
    double low = *value(f, i), high = low;
    for (int32_t m = 0; m < p->count[i]; m++) {
      const double e = *value(f, p->index[wend_pairs_entry(p, i, m)]);
      low = fmin(low, e);
      high = fmax(high, e);
    }
    const double next = *value(f, i) + f->step / f->w->volume[i] * f->rate[i];
    if (!(fabs(next) <= 1e300)) return INFINITY;
    worst = fmax(worst, fmax(low - next, next - high) / fmax(high, 1e-300));
  }
  return worst;
}

/* 200 states a web and form, 2400 in all, fields, coefficients and energies drawn anew. The
 * change of a value is a sum of up to 100 terms, whose magnitudes at the limit add up to twice
 * the largest value: 2e-14. Without the limiter some states break the bounds by far. */
START_TEST(values_stay_between_their_neighbours) {
  const bool along = _i % 2 == 0;
  web w = web_create(&plans[_i / 2], 6);
  web_close(&w);
  web_magnetise(&w, !along, 6);
  flow f = flow_create(&w, along);
  double broken = 0;
  for (uint64_t seed = 0; seed < 200; seed++) {
    web_magnetise(&w, !along, 1000 + seed);
    flow_prepare(&f);
    energise(&f, seed);
    run(&f, true);
    ck_assert_double_le(excess(&f), 2e-14);
    if (seed >= 9) continue;
    run(&f, false);
    broken = fmax(broken, excess(&f));
  }
  ck_assert_double_gt(broken, 0.01);
  flow_destroy(&f);
  web_destroy(&w);
}
END_TEST

START_TEST(equal_values_do_not_move) {
  web w = web_create(&plans[_i], 7);
  web_magnetise(&w, true, 7);
  flow f = flow_create(&w, false);
  for (int32_t i = 0; i < w.l.n; i++) *value(&f, i) = 0.1;
  run(&f, true);
  for (int32_t i = 0; i < w.l.n; i++) ck_assert(f.rate[i] == 0);
  flow_destroy(&f);
  web_destroy(&w);
}
END_TEST

/* ---- counting ---- */

START_TEST(limited_entries_are_counted) {
  web_plan padded = plans[_i];
  padded.extra = 2;
  web w = web_create(&padded, 8);
  web_magnetise(&w, false, 8);
  flow f = flow_create(&w, true);
  energise(&f, 2);
  run(&f, true);
  int64_t counts[2], expected[2] = {0};
  for (int32_t i = 0; i < w.l.n; i++)
    for (int32_t m = 0; m < w.l.pairs.count[i]; m++) {
      const int64_t k = wend_pairs_entry(&w.l.pairs, i, m);
      const int32_t j = w.l.pairs.index[k];
      const int up = f.anti[k] > 0 ? 0 : 1;
      expected[0] += f.anti[k] != 0 && (f.ratio[i][up] < 1 || f.ratio[j][1 - up] < 1);
      expected[1] += f.anti[k] != 0;
    }
  wend_exchange_count_limited(&w.l.pairs, w.l.all, f.anti, (const double(*)[2])f.ratio, counts);
  ck_assert_int_eq(counts[0], expected[0]);
  ck_assert_int_eq(counts[1], expected[1]);
  ck_assert(counts[0] > 0 && counts[0] < counts[1]);
  flow_destroy(&f);
  web_destroy(&w);
}
END_TEST

int main(void) {
  Suite *suite = suite_create("exchange");
  TCase *tc = tcase_create("passes");
  tcase_add_loop_test(tc, passes_follow_the_formulas_to_the_bit, 0, 2 * PLANS);
  tcase_add_loop_test(tc, padding_and_slices_change_no_bit, 0, 2 * PLANS);
  tcase_add_loop_test(tc, what_leaves_one_end_enters_the_other, 0, 2 * PLANS);
  tcase_add_loop_test(tc, limited_entries_are_counted, 0, PLANS);
  suite_add_tcase(suite, tc);
  tc = tcase_create("accuracy");
  tcase_add_loop_test(tc, linear_fields_stay, 0, 4);
  tcase_add_loop_test(tc, both_forms_agree_without_kappa_perp, 0, PLANS);
  suite_add_tcase(suite, tc);
  tc = tcase_create("bounds");
  tcase_add_loop_test(tc, values_stay_between_their_neighbours, 0, 2 * PLANS);
  tcase_add_loop_test(tc, equal_values_do_not_move, 0, PLANS);
  suite_add_tcase(suite, tc);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  return failed != 0;
}
