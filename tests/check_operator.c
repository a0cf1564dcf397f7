/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_operator.c: pair coefficients against their formulas, from both ends to the bit, and
 * exact for linear fields; escape through flat surfaces. */
#include "operator.h"

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

/* A web with closed faces, fields and coefficients. */
static web dressed(const web_plan *plan, bool across, uint64_t seed) {
  web w = web_create(plan, seed);
  web_close(&w);
  web_magnetise(&w, across, seed);
  return w;
}

static double dot(const double *a, const double *b) {
  return a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
}

/* Check's own comparison is strict, and 0 = 0 within 0. */
static bool near(double a, double b, double give) { return fabs(a - b) <= give; }

static void entry(float *const column[3], int64_t k, double v[3]) {
  for (int d = 0; d < 3; d++) v[d] = column[d][k];
}

/* ---- low order ---- */

typedef struct low {
  float *kept;
  double *full, *both; /* [rows] sums */
} low;

static low low_order(const web *w, double power, double share) {
  low l = {.kept = web_column(w)};
  l.full = calloc((size_t)w->l.n, sizeof *l.full);
  l.both = calloc((size_t)w->l.n, sizeof *l.both);
  wend_operator_source source = web_operator(w);
  source.angle_power = power;
  source.angle_share = share;
  wend_operator_low_order(&w->l.pairs, w->l.all, &source, &w->faces, l.kept, l.full, l.both);
  return l;
}

static void low_destroy(low *l) {
  free(l->kept);
  free(l->full);
  free(l->both);
}

/* a_ij and s_ij of one entry, and the size of what cancels in them. */
static void by_formula(const web *w, int32_t i, int64_t k, double *a, double *s, double *size) {
  const int32_t j = w->l.pairs.index[k];
  double area[3], r[3];
  entry(w->faces.area, k, area);
  entry(w->faces.arm, k, r);
  const double *bi = w->field[i], *bj = w->field[j];
  const double k_i = w->kappa[i][0] - w->kappa[i][1], k_j = w->kappa[j][0] - w->kappa[j][1];
  const double along = (k_i + k_j) / 2 *
                       (dot(area, bi) * dot(bi, r) + dot(area, bj) * dot(bj, r)) /
                       (2 * dot(r, r));
  const double rest = (w->kappa[i][1] + w->kappa[j][1]) / 2 * dot(area, r) / dot(r, r);
  const double c2 = (pow(dot(bi, r), 2) + pow(dot(bj, r), 2)) / (2 * dot(r, r));
  *a = fmax(0, along + rest);
  *s = fmin(*a, fmax(0, 0.6 * pow(c2, 4) * along + rest));
  *size = (fabs(k_i) + fabs(k_j) + w->kappa[i][1] + w->kappa[j][1]) *
          sqrt(dot(area, area) / dot(r, r));
}

/* The limiter's room: all of sum_j a_ij, up to 10 times the largest coefficient over H^2, which
 * is about its mean on even particles. */
static double room(const web *w, int32_t i, double full) {
  const wend_pairs *p = &w->l.pairs;
  double kappa = 0;
  for (int32_t m = 0; m < p->count[i]; m++) {
    const int32_t j = p->index[wend_pairs_entry(p, i, m)];
    const double par = (w->kappa[i][0] + w->kappa[j][0]) / 2;
    const double perp = (w->kappa[i][1] + w->kappa[j][1]) / 2;
    kappa = fmax(kappa, fmax(0, par - perp) + w->l.domain.dim * perp);
  }
  return fmin(full, 10 * kappa * w->volume[i] / pow(w->l.place[i][3], 2));
}

/* Rounding to float, and of double on what cancels. */
START_TEST(low_order_follows_the_formula) {
  int capped = 0;
  for (int across = 0; across < 2; across++) {
    web w = dressed(&plans[_i], across, 1);
    low l = low_order(&w, 4, 0.6);
    for (int32_t i = 0; i < w.l.n; i++) {
      double full = 0, kept = 0;
      for (int32_t m = 0; m < w.l.pairs.count[i]; m++) {
        const int64_t k = wend_pairs_entry(&w.l.pairs, i, m);
        double a, s, size;
        by_formula(&w, i, k, &a, &s, &size);
        ck_assert(near(l.kept[k], s, ulp * s + 1e-14 * size));
        full += a;
        kept += s;
      }
      capped += room(&w, i, full) < full;
      full = room(&w, i, full);
      ck_assert(near(l.full[i], full, 2 * ulp * full));
      ck_assert(near(l.both[i], full + kept, 2 * ulp * (full + kept)));
    }
    low_destroy(&l);
    web_destroy(&w);
  }
  ck_assert_int_gt(capped, 0);
}
END_TEST

/* With p = 0 and phi = 1 all of a_ij is kept, which shows a_ij itself. */
START_TEST(what_is_kept_is_a_share_of_the_whole) {
  for (int across = 0; across < 2; across++) {
    web w = dressed(&plans[_i], across, 2);
    low whole = low_order(&w, 0, 1), part = low_order(&w, 4, 0.6), none = low_order(&w, 4, 0);
    int positive = 0, smaller = 0;
    for (int32_t i = 0; i < w.l.n; i++) {
      double full = 0, kept = 0;
      for (int32_t m = 0; m < w.l.pairs.count[i]; m++) {
        const int64_t k = wend_pairs_entry(&w.l.pairs, i, m);
        const int64_t twin = web_twin(&w, i, k);
        ck_assert(part.kept[k] >= 0 && part.kept[k] <= whole.kept[k]);
        ck_assert(across || none.kept[k] == 0);
        ck_assert(web_same_float(part.kept[k], part.kept[twin]));
        ck_assert(web_same_float(whole.kept[k], whole.kept[twin]));
        positive += whole.kept[k] > 0;
        smaller += part.kept[k] < whole.kept[k];
        full += whole.kept[k];
        kept += part.kept[k];
      }
      full = room(&w, i, full);
      ck_assert(near(part.full[i], full, 1e-15 * full) && whole.full[i] == part.full[i]);
      ck_assert(part.both[i] == part.full[i] + kept);
    }
    ck_assert(positive > 0 && smaller > positive / 4);
    low_destroy(&whole);
    low_destroy(&part);
    low_destroy(&none);
    web_destroy(&w);
  }
}
END_TEST

/* ---- gradients ---- */

/* The linear field 3 + slope.x of place differences: periodic images count as they lie. */
static const double slope_of[3] = {1.5, -0.7, 0.4};

/* Rounding of c_ij and of the arms to float: 4 ulp of the sum of magnitudes. */
START_TEST(gradients_of_linear_fields_are_exact) {
  web w = dressed(&plans[_i], true, 3);
  const wend_operator_source source = web_operator(&w);
  float *c[3] = {web_column(&w), web_column(&w), web_column(&w)}, *d = web_column(&w);
  wend_operator_gradient(&w.l.pairs, w.l.all, &source, w.faces.arm, c);
  wend_operator_slope(&w.l.pairs, w.l.all, &source, w.faces.arm, d);
  for (int32_t i = 0; i < w.l.n; i++) {
    double g[3] = {0}, along = 0, size = 0;
    for (int32_t m = 0; m < w.l.pairs.count[i]; m++) {
      const int64_t k = wend_pairs_entry(&w.l.pairs, i, m);
      double r[3], ck[3];
      entry(w.faces.arm, k, r);
      entry(c, k, ck);
      const double rise = dot(slope_of, r);
      for (int a = 0; a < 3; a++) g[a] += ck[a] * rise;
      along += d[k] * rise;
      size += sqrt(dot(ck, ck)) * fabs(rise);
      const double own = w.l.place[i][3];
      if (dot(r, r) > own * own * (1 + 4 * ulp)) ck_assert(d[k] == 0 && dot(ck, ck) == 0);
    }
    for (int a = 0; a < 3; a++) {
      const double exact = a < w.l.domain.dim ? slope_of[a] : 0;
      ck_assert(near(g[a], exact, 4 * ulp * size));
    }
    double expected = 0;
    for (int a = 0; a < w.l.domain.dim; a++) expected += w.field[i][a] * slope_of[a];
    ck_assert(near(along, expected, 4 * ulp * size));
  }
  for (int a = 0; a < 3; a++) free(c[a]);
  free(d);
  web_destroy(&w);
}
END_TEST

START_TEST(gradients_may_take_the_place_of_arms) {
  web w = dressed(&plans[_i], true, 9);
  const wend_operator_source source = web_operator(&w);
  const size_t size = (size_t)web_entries(&w) * sizeof(float);
  float *c[3] = {web_column(&w), web_column(&w), web_column(&w)};
  wend_operator_gradient(&w.l.pairs, w.l.all, &source, w.faces.arm, c);
  wend_operator_gradient(&w.l.pairs, w.l.all, &source, w.faces.arm, w.faces.arm);
  for (int a = 0; a < 3; a++) {
    ck_assert(memcmp(c[a], w.faces.arm[a], size) == 0);
    free(c[a]);
  }
  web_destroy(&w);
}
END_TEST

START_TEST(halves_of_the_flux_are_odd) {
  web w = dressed(&plans[_i], true, 4);
  float *alpha = web_column(&w), *beta = web_column(&w);
  wend_operator_along(&w.l.pairs, w.l.all, (const double(*)[3])w.field, w.faces.area, alpha,
                      beta);
  for (int32_t i = 0; i < w.l.n; i++)
    for (int32_t m = 0; m < w.l.pairs.count[i]; m++) {
      const int64_t k = wend_pairs_entry(&w.l.pairs, i, m), twin = web_twin(&w, i, k);
      const int32_t j = w.l.pairs.index[k];
      double a[3];
      entry(w.faces.area, k, a);
      ck_assert(alpha[k] == -beta[twin]);
      ck_assert(beta[k] == -alpha[twin]);
      ck_assert(alpha[k] == (float)(dot(a, w.field[i]) / 2));
      ck_assert(beta[k] == (float)(dot(a, w.field[j]) / 2));
    }
  free(alpha);
  free(beta);
  web_destroy(&w);
}
END_TEST

/* ---- padding and places on each other ---- */

START_TEST(padding_is_zero_and_changes_nothing) {
  web_plan padded = plans[_i];
  padded.extra = 3;
  web w = dressed(&plans[_i], true, 5), v = dressed(&padded, true, 5);
  low lw = low_order(&w, 4, 0.6), lv = low_order(&v, 4, 0.6);
  const wend_operator_source source = web_operator(&v);
  float *column[6];
  for (int k = 0; k < 6; k++) column[k] = web_column(&v);
  wend_operator_gradient(&v.l.pairs, v.l.all, &source, v.faces.arm, column);
  wend_operator_slope(&v.l.pairs, v.l.all, &source, v.faces.arm, column[3]);
  wend_operator_along(&v.l.pairs, v.l.all, source.field, v.faces.area, column[4], column[5]);
  for (int32_t i = 0; i < v.l.pairs.slices * WEND_LANES; i++) {
    const bool row = i < v.l.n;
    ck_assert(!row || web_same(lw.full[i], lv.full[i]));
    ck_assert(!row || web_same(lw.both[i], lv.both[i]));
    for (int32_t m = row ? v.l.pairs.count[i] : 0;
         m < wend_pairs_width(&v.l.pairs, i / WEND_LANES); m++) {
      const int64_t k = wend_pairs_entry(&v.l.pairs, i, m);
      ck_assert(lv.kept[k] == 0);
      for (int c = 0; c < 6; c++) ck_assert(column[c][k] == 0);
    }
  }
  for (int k = 0; k < 6; k++) free(column[k]);
  low_destroy(&lw);
  low_destroy(&lv);
  web_destroy(&w);
  web_destroy(&v);
}
END_TEST

/* Two particles on one place exchange nothing: no direction, no division by 0. */
START_TEST(coincident_particles_exchange_nothing) {
  web w = dressed(&plans[0], true, 6);
  const int64_t k = wend_pairs_entry(&w.l.pairs, 5, 0);
  for (int d = 0; d < 3; d++) w.faces.arm[d][k] = 0;
  low l = low_order(&w, 4, 0.6);
  ck_assert(l.kept[k] == 0);
  ck_assert(isfinite(l.full[5]) && isfinite(l.both[5]));
  low_destroy(&l);
  web_destroy(&w);
}
END_TEST

/* ---- escape ---- */

static double *escape_of(const web *w) {
  double *rate = calloc((size_t)w->l.n, sizeof *rate);
  const wend_operator_source source = web_operator(w);
  wend_operator_escape(&w->l.pairs, w->l.all, &source, &w->faces, w->surface, rate);
  return rate;
}

/* m_i from all entries; 1e-12 for another order of sums. */
START_TEST(escape_follows_the_formula) {
  static const web_plan open[] = {{2, 0, 12, 0.3, 2.6, 0}, {3, 1, 6, 0.3, 2.3, 0}};
  for (int across = 0; across < 2; across++) {
    web w = dressed(&open[_i], across, 7);
    w.l.domain.thickness = _i == 0 ? 0.25 : 1;
    w.l.domain.open[1] = true; /* the other free surfaces are closed */
    double *rate = escape_of(&w);
    int leaving = 0;
    for (int32_t i = 0; i < w.l.n; i++) {
      double m = 0;
      for (int32_t e = w.l.pairs.count[i] - 1; e >= 0; e--)
        m -= w.faces.area[1][wend_pairs_entry(&w.l.pairs, i, e)];
      const double mb = m * w.field[i][1], *kappa = w.kappa[i];
      const double width =
          _i == 0 ? pow(w.volume[i] / 0.25, 1.0 / 2) : pow(w.volume[i], 1.0 / 3);
      const double expected =
          2 * (kappa[0] * mb * mb + kappa[1] * (m * m - mb * mb)) / (fabs(m) * width);
      ck_assert(near(rate[i], w.surface[i] ? expected : 0, 1e-12 * expected));
      ck_assert(rate[i] >= 0);
      leaving += rate[i] > 0;
    }
    ck_assert_int_gt(leaving, 10);
    free(rate);
    web_destroy(&w);
  }
}
END_TEST

/* A lattice, open above and below, field upright: each border particle stands for one
 * spacing of surface half a spacing away, through which 2 kappa e leaves. Once the inside is
 * closed the flow is right within a tenth; raw faces let out 1.4 times as much. */
START_TEST(flat_surfaces_miss_their_area) {
  const web_plan plan[2] = {{2, 1, 12, 0.2, 2.6, 0}, {3, 3, 8, 0.2, 2.3, 0}};
  web w = web_create(&plan[_i], 8);
  const int up = plan[_i].dim - 1;
  const double spacing = 2.0 / plan[_i].side, border = 2 * pow(plan[_i].side, up);
  w.l.domain.open[up] = true;
  for (int32_t i = 0; i < w.l.n; i++) {
    w.field[i][up] = 1;
    w.kappa[i][0] = 0.5;
  }
  double flow[2];
  for (int closed = 0; closed < 2; closed++) {
    if (closed) web_close(&w);
    double *rate = escape_of(&w);
    flow[closed] = 0;
    for (int32_t i = 0; i < w.l.n; i++)
      flow[closed] += rate[i] / (border * pow(spacing, up - 1));
    free(rate);
  }
  ck_assert(near(flow[1], 2 * 0.5, 0.1));
  ck_assert_double_gt(flow[0], 1.3);
  web_destroy(&w);
}
END_TEST

int main(void) {
  Suite *suite = suite_create("operator");
  TCase *tc = tcase_create("pairs");
  tcase_add_loop_test(tc, low_order_follows_the_formula, 0, PLANS);
  tcase_add_loop_test(tc, what_is_kept_is_a_share_of_the_whole, 0, PLANS);
  tcase_add_loop_test(tc, gradients_of_linear_fields_are_exact, 0, PLANS);
  tcase_add_loop_test(tc, gradients_may_take_the_place_of_arms, 0, PLANS);
  tcase_add_loop_test(tc, halves_of_the_flux_are_odd, 0, PLANS);
  tcase_add_loop_test(tc, padding_is_zero_and_changes_nothing, 0, PLANS);
  tcase_add_test(tc, coincident_particles_exchange_nothing);
  suite_add_tcase(suite, tc);
  tc = tcase_create("escape");
  tcase_add_loop_test(tc, escape_follows_the_formula, 0, 2);
  tcase_add_loop_test(tc, flat_surfaces_miss_their_area, 0, 2);
  suite_add_tcase(suite, tc);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  return failed != 0;
}
