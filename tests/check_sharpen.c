/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_sharpen.c: sharpening leaves constant fluxes alone, has the second moment it promises,
 * and cancels the k^2 error of a mode on a lattice. */
#include "sharpen.h"

#include "lists.h"

#include <check.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>

enum { SIDE = 24 };

/* A periodic square lattice with supports of 2.6 spacings. */
typedef struct grid {
  lists l;
  float *arm[3], *mu;
  double (*field)[3];
} grid;

static grid grid_create(bool along) {
  grid g = {.l = lists_create(lists_box(2, 3), SIDE * SIDE)};
  const double spacing = 2.0 / SIDE;
  for (int32_t i = 0; i < g.l.n; i++) {
    g.l.place[i][0] = -1 + (i % SIDE + 0.5) * spacing;
    g.l.place[i][1] = -1 + (i / SIDE + 0.5) * spacing;
    g.l.place[i][3] = 2.6 * spacing;
  }
  lists_find(&g.l, g.l.n, 0);
  const size_t entries = (size_t)g.l.pairs.first[g.l.pairs.slices];
  for (int d = 0; d < 3; d++) g.arm[d] = calloc(entries, sizeof(float));
  g.mu = calloc(entries, sizeof(float));
  g.field = calloc((size_t)g.l.n, sizeof *g.field);
  for (int32_t i = 0; i < g.l.n; i++) {
    g.field[i][0] = cos(0.5);
    g.field[i][1] = sin(0.5);
    for (int32_t m = 0; m < g.l.pairs.count[i]; m++) {
      const int64_t k = wend_pairs_entry(&g.l.pairs, i, m);
      for (int d = 0; d < 2; d++)
        g.arm[d][k] = (float)wend_domain_wrap(
            &g.l.domain, d, g.l.place[g.l.pairs.index[k]][d] - g.l.place[i][d]);
    }
  }
  const wend_face_source source = {.domain = &g.l.domain,
                                   .smoothing = wend_smoothing_find("wendland-c2"),
                                   .place = (const double(*)[4])g.l.place};
  wend_sharpen_weights(&g.l.pairs, g.l.all, &source, (const double(*)[3])g.field, along, g.arm,
                       g.mu);
  return g;
}

static void grid_destroy(grid *g) {
  lists_destroy(&g->l);
  for (int d = 0; d < 3; d++) free(g->arm[d]);
  free(g->mu);
  free(g->field);
}

/* sum_j mu x^2 of row 0 must be (2/3) m4/m2, moments of the kernel about it. */
START_TEST(second_moment_is_as_promised) {
  for (int along = 0; along < 2; along++) {
    grid g = grid_create(along);
    const wend_smoothing *smoothing = wend_smoothing_find("wendland-c2");
    double m2 = 0, m4 = 0, spread = 0;
    for (int32_t m = 0; m < g.l.pairs.count[0]; m++) {
      const int64_t k = wend_pairs_entry(&g.l.pairs, 0, m);
      const double x = g.arm[0][k], y = g.arm[1][k], r2 = x * x + y * y;
      const double b = cos(0.5) * x + sin(0.5) * y, q = sqrt(r2) / g.l.place[0][3];
      double w;
      smoothing->shape(1, &q, &w);
      const double x2 = along ? b * b : r2 / 2, x4 = along ? pow(b, 4) : 3 * r2 * r2 / 8;
      m2 += w * x2;
      m4 += w * x4;
      spread += g.mu[k] * x2;
      ck_assert(g.mu[k] >= 0);
    }
    ck_assert_double_eq_tol(spread, 2 * m4 / (3 * m2), 1e-6 * spread); /* mu is a float */
    grid_destroy(&g);
  }
}
END_TEST

START_TEST(constant_fluxes_keep_their_bits) {
  for (int width = 2; width <= 4; width += 2) {
    grid g = grid_create(width == 2);
    const size_t n = (size_t)g.l.n;
    double *state = calloc(n * (size_t)width, sizeof *state);
    double *sharp = calloc(n * (size_t)width, sizeof *sharp);
    for (size_t i = 0; i < n; i++)
      for (int d = 1; d < width; d++) state[i * (size_t)width + (size_t)d] = 0.1 * d;
    wend_sharpen_flux(&g.l.pairs, g.l.all, g.mu, state, width, sharp);
    for (size_t i = 0; i < n; i++)
      for (int d = 1; d < width; d++)
        ck_assert(sharp[i * (size_t)(width - 1) + (size_t)(d - 1)] == 0.1 * d);
    free(state);
    free(sharp);
    grid_destroy(&g);
  }
}
END_TEST

/* A mode q = sin(k b.x) grows by 1 + k^2 (1/3) m4/m2, to the next order in k: the inverse of
 * what slope and face take away. The kernel's moments in the plane are (Wendland C2, by hand)
 * <x^2> = 5/72 H^2 and <x^4> = 7/528 H^4. */
START_TEST(a_mode_is_raised_by_what_smoothing_took) {
  grid g = grid_create(true);
  const double k = M_PI, h = g.l.place[0][3];
  const double want = 1 + k * k / 3 * (7.0 / 528) / (5.0 / 72) * h * h;
  double(*state)[2] = calloc((size_t)g.l.n, sizeof *state);
  double *sharp = calloc((size_t)g.l.n, sizeof *sharp), top = 0;
  for (int32_t i = 0; i < g.l.n; i++) g.field[i][0] = 1, g.field[i][1] = 0;
  const wend_face_source source = {.domain = &g.l.domain,
                                   .smoothing = wend_smoothing_find("wendland-c2"),
                                   .place = (const double(*)[4])g.l.place};
  wend_sharpen_weights(&g.l.pairs, g.l.all, &source, (const double(*)[3])g.field, true, g.arm,
                       g.mu);
  for (int32_t i = 0; i < g.l.n; i++) state[i][1] = sin(k * g.l.place[i][0]);
  wend_sharpen_flux(&g.l.pairs, g.l.all, g.mu, (const double *)state, 2, sharp);
  for (int32_t i = 0; i < g.l.n; i++) top = fmax(top, fabs(sharp[i] / state[i][1] - want));
  printf("raised by %.5f for %.5f, off by %.1e at most\n", sharp[0] / state[0][1], want, top);
  /* next order: (k H)^4 times 1e-3 (weights cos^4), and lattice sums for integrals */
  ck_assert_double_lt(top, 0.1 * (want - 1));
  free(state);
  free(sharp);
  grid_destroy(&g);
}
END_TEST

START_TEST(a_lone_flux_is_left_as_it_is) {
  grid g = grid_create(true);
  double(*state)[2] = calloc((size_t)g.l.n, sizeof *state);
  double *sharp = calloc((size_t)g.l.n, sizeof *sharp);
  state[100][1] = 1;
  wend_sharpen_flux(&g.l.pairs, g.l.all, g.mu, (const double *)state, 2, sharp);
  for (int32_t i = 0; i < g.l.n; i++) ck_assert(sharp[i] == (i == 100 ? 1.0 : 0.0));
  free(state);
  free(sharp);
  grid_destroy(&g);
}
END_TEST

int main(void) {
  Suite *suite = suite_create("sharpen");
  TCase *cases = tcase_create("sharpen");
  tcase_add_test(cases, second_moment_is_as_promised);
  tcase_add_test(cases, constant_fluxes_keep_their_bits);
  tcase_add_test(cases, a_mode_is_raised_by_what_smoothing_took);
  tcase_add_test(cases, a_lone_flux_is_left_as_it_is);
  suite_add_tcase(suite, cases);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  return failed != 0;
}
