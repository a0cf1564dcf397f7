/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_gradient.c: least-squares gradients: linear fields, GSL's inverse, degenerate sets,
 * symmetry. */
#include "gradient.h"

#include "lists.h"

#include <check.h>
#include <gsl/gsl_linalg.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

static const wend_smoothing *c2(void) { return wend_smoothing_find("wendland-c2"); }

/* About 25 neighbours in 2-D and 45 in 3-D, supports varying by 2; rows longer than one piece.
 */
static lists scattered(int dim, unsigned periodic, uint64_t seed) {
  lists l = lists_create(lists_box(dim, periodic), dim == 2 ? 400 : 700);
  lists_scatter(&l, dim == 2 ? 0.28 : 0.6, seed);
  lists_find(&l, l.n - 77,
             0); /* the last 77 are ghosts; 323 and 623 rows: not multiples of 8 */
  return l;
}

static wend_batch_source source_of(const lists *l) {
  return (wend_batch_source){&l->pairs, &l->domain, c2(), (const double(*)[4])l->place};
}

/* The caller frees. */
static double (*matrices_of(const lists *l, int32_t *fallbacks))[6] {
  double(*inverse)[6] = calloc((size_t)l->n + 1, sizeof *inverse);
  ck_assert_ptr_nonnull(inverse);
  *fallbacks = wend_gradient_matrices(&l->pairs, l->all, &l->domain, c2(),
                                      (const double(*)[4])l->place, inverse);
  return inverse;
}

static void arm(const lists *l, int32_t i, int32_t j, double r[3]) {
  for (int a = 0; a < 3; a++)
    r[a] = a < l->domain.dim ? wend_domain_wrap(&l->domain, a, l->place[j][a] - l->place[i][a])
                             : 0;
}

static double weight(const lists *l, int32_t i, const double r[3]) {
  const double h = l->place[i][3], q = sqrt(r[0] * r[0] + r[1] * r[1] + r[2] * r[2]) / h;
  double s;
  c2()->shape(1, &q, &s);
  return c2()->norm[l->domain.dim - 2] / (l->domain.dim == 2 ? h * h : h * h * h) * s;
}

/* M_i, one entry after the other, as the formula says. */
static void moments(const lists *l, int32_t i, double m[3][3]) {
  memset(m, 0, 9 * sizeof(double));
  for (int32_t k = 0; k < l->pairs.count[i]; k++) {
    double r[3];
    arm(l, i, l->pairs.index[wend_pairs_entry(&l->pairs, i, k)], r);
    const double w = weight(l, i, r);
    for (int a = 0; a < 3; a++)
      for (int b = 0; b < 3; b++) m[a][b] += w * (r[a] * r[b]);
  }
}

/* |M| |M^-1| in Frobenius norms, by which rounding errors of M^-1 exceed the unit round-off. */
static double condition(const double m[3][3], const double inverse[6]) {
  double a = 0.0, b = 0.0;
  for (int k = 0; k < 6; k++)
    b += inverse[k] * inverse[k] * (k == 0 || k == 3 || k == 5 ? 1.0 : 2.0);
  for (int k = 0; k < 9; k++) a += m[k / 3][k % 3] * m[k / 3][k % 3];
  return sqrt(a * b);
}

static const struct {
  int dim;
  unsigned periodic;
} boxes[] = {{2, 0}, {2, 3}, {2, 1}, {3, 0}, {3, 7}, {3, 5}};
enum { BOXES = sizeof boxes / sizeof boxes[0] };

/* Field linear about each row in turn, so that it is linear across a periodic border too.
 * Error: about 50 terms c_ij (e_j - e_i) that cancel by at most 1/condition < 1e3 here: 1e-16 *
 * 1e3. */
START_TEST(linear_fields_are_exact) {
  const double slope[3] = {0.7, -1.3, 2.1};
  lists l = scattered(boxes[_i].dim, boxes[_i].periodic, 1);
  const wend_batch_source source = source_of(&l);
  int32_t fallbacks;
  double(*inverse)[6] = matrices_of(&l, &fallbacks);
  double *field = calloc((size_t)l.n, sizeof *field);
  double(*gradient)[3] = calloc((size_t)l.n, sizeof *gradient);
  ck_assert_int_eq(fallbacks, 0);
  for (int32_t i = 0; i < l.pairs.rows; i++) {
    const int32_t slice = i / WEND_LANES;
    double r[3];
    for (int32_t j = 0; j < l.n; j++) {
      arm(&l, i, j, r);
      field[j] = 3.0 + slope[0] * r[0] + slope[1] * r[1] + slope[2] * r[2];
    }
    wend_gradient_apply(&source, (wend_slices){1, &slice}, (const double(*)[6])inverse, field,
                        gradient);
    double m[3][3];
    moments(&l, i, m);
    const double tolerance = 4e-15 * condition((const double(*)[3])m, inverse[i]);
    for (int a = 0; a < 3; a++) {
      const double expected = a < l.domain.dim ? slope[a] : 0.0;
      ck_assert_double_eq_tol(gradient[i][a], expected, tolerance);
    }
  }
  free(gradient);
  free(field);
  free(inverse);
  lists_destroy(&l);
}
END_TEST

/* Against GSL's Cholesky inverse of the same matrix; relative to the largest element. Both err
 * by about 1e-16 times the condition number, below 1e3 here. */
START_TEST(inverses_match_gsl) {
  lists l = scattered(boxes[_i].dim, boxes[_i].periodic, 2);
  const size_t dim = (size_t)l.domain.dim;
  int32_t fallbacks;
  double(*inverse)[6] = matrices_of(&l, &fallbacks);
  gsl_matrix *g = gsl_matrix_alloc(dim, dim);
  for (int32_t i = 0; i < l.pairs.rows; i++) {
    double m[3][3];
    moments(&l, i, m);
    for (size_t a = 0; a < dim; a++)
      for (size_t b = 0; b < dim; b++) gsl_matrix_set(g, a, b, m[a][b]);
    gsl_linalg_cholesky_decomp1(g);
    gsl_linalg_cholesky_invert(g);
    const double *u = inverse[i];
    const double tolerance = 1e-15 * condition((const double(*)[3])m, u) * gsl_matrix_max(g);
    const double full[3][3] = {{u[0], u[1], u[2]}, {u[1], u[3], u[4]}, {u[2], u[4], u[5]}};
    for (size_t a = 0; a < 3; a++)
      for (size_t b = 0; b < 3; b++)
        if (a < dim && b < dim)
          ck_assert_double_eq_tol(full[a][b], gsl_matrix_get(g, a, b), tolerance);
        else
          ck_assert(full[a][b] == 0.0);
  }
  gsl_matrix_free(g);
  free(inverse);
  lists_destroy(&l);
}
END_TEST

/* c_ij = M_i^-1 r_ij w_ij entry by entry, to a few roundings of |M^-1| H W(0, H); exactly zero
 * beyond the own support and on padding. */
START_TEST(coefficients_follow_the_formula) {
  lists l = scattered(boxes[_i].dim, boxes[_i].periodic, 3);
  const wend_batch_source source = source_of(&l);
  int32_t fallbacks, beyond = 0;
  double(*inverse)[6] = matrices_of(&l, &fallbacks);
  const double origin[3] = {0, 0, 0};
  double c[3][WEND_BATCH], r[3];
  wend_batch batch;
  for (int32_t s = 0; s < l.pairs.slices; s++) {
    wend_batch_open(&source, s, &batch);
    while (wend_batch_next(&source, &batch)) {
      wend_gradient_coefficients(&batch, (const double(*)[6])inverse, c);
      for (int e = 0; e < batch.n; e++) {
        const int32_t i = batch.row[e % WEND_LANES], j = l.pairs.index[batch.first + e];
        const double *u = inverse[i];
        arm(&l, i, j, r);
        const double h = l.place[i][3], w = i == j ? 0.0 : weight(&l, i, r);
        const double expected[3] = {w * (u[0] * r[0] + u[1] * r[1] + u[2] * r[2]),
                                    w * (u[1] * r[0] + u[3] * r[1] + u[4] * r[2]),
                                    w * (u[2] * r[0] + u[4] * r[1] + u[5] * r[2])};
        const double scale = (u[0] + u[3] + u[5]) * h * weight(&l, i, origin);
        beyond += i != j && w == 0.0;
        for (int a = 0; a < 3; a++) {
          const double tolerance = w == 0.0 ? 0.0 : 1e-15 * scale;
          ck_assert_double_le(fabs(c[a][e] - expected[a]), tolerance);
        }
      }
    }
  }
  ck_assert_int_gt(beyond, 100); /* the set does hold entries beyond the own support */
  free(inverse);
  lists_destroy(&l);
}
END_TEST

/* Sums run in list order: however rows are cut into pieces and however much padding their
 * neighbours in a slice cause, the bits are those of one row summed alone. */
START_TEST(padding_and_pieces_change_no_bit) {
  lists l = scattered(boxes[_i].dim, boxes[_i].periodic, 4);
  int32_t fallbacks;
  double(*tight)[6] = matrices_of(&l, &fallbacks);
  for (int32_t extra = 1; extra < 100; extra += 49) {
    lists_find(&l, l.n - 77, extra);
    double(*loose)[6] = matrices_of(&l, &fallbacks);
    ck_assert_mem_eq(tight, loose, (size_t)l.pairs.rows * sizeof *tight);
    free(loose);
  }
  const int32_t slice = 3;
  double(*some)[6] = calloc((size_t)l.n, sizeof *some);
  wend_gradient_matrices(&l.pairs, (wend_slices){1, &slice}, &l.domain, c2(),
                         (const double(*)[4])l.place, some);
  ck_assert_mem_eq(some[24], tight[24], WEND_LANES * sizeof *some);
  for (int32_t i = 0; i < l.n; i++) /* rows of other slices stay untouched */
    ck_assert(i / WEND_LANES == slice || (some[i][0] == 0.0 && some[i][3] == 0.0));
  free(some);
  free(tight);
  lists_destroy(&l);
}
END_TEST

/* Mirrored particles: the same matrices and the opposite gradient, bit for bit. */
START_TEST(mirrored_particles_give_opposite_gradients) {
  lists l = scattered(boxes[_i].dim, boxes[_i].periodic, 5);
  const wend_batch_source source = source_of(&l);
  double(*gradient[2])[3], (*inverse[2])[6], *field = calloc((size_t)l.n, sizeof *field);
  int32_t fallbacks;
  for (int32_t i = 0; i < l.n; i++)
    field[i] = sin(3.0 * l.place[i][0]) + cos(2.0 * l.place[i][1] + l.place[i][2]);
  for (int k = 0; k < 2; k++) {
    inverse[k] = matrices_of(&l, &fallbacks);
    gradient[k] = calloc((size_t)l.n, sizeof **gradient);
    wend_gradient_apply(&source, l.all, (const double(*)[6])inverse[k], field, gradient[k]);
    for (int32_t i = 0; i < l.n; i++)
      for (int a = 0; a < 3; a++) l.place[i][a] = -l.place[i][a];
  }
  ck_assert_mem_eq(inverse[0], inverse[1], (size_t)l.pairs.rows * sizeof **inverse);
  for (int32_t i = 0; i < l.pairs.rows; i++)
    for (int a = 0; a < 3; a++) ck_assert(gradient[0][i][a] == -gradient[1][i][a]);
  for (int k = 0; k < 2; k++) {
    free(gradient[k]);
    free(inverse[k]);
  }
  free(field);
  lists_destroy(&l);
}
END_TEST

/* Lengths times 2^k: every rounding stays the same, so M^-1 (a length^(dim - 2)) scales
 * exactly. */
START_TEST(units_do_not_matter) {
  for (int k = -80; k <= 80; k += 160) {
    lists l = scattered(boxes[_i].dim, boxes[_i].periodic, 6);
    int32_t fallbacks, scaled_fallbacks;
    double(*inverse)[6] = matrices_of(&l, &fallbacks);
    for (int32_t i = 0; i < l.n; i++)
      for (int a = 0; a < 4; a++) l.place[i][a] = ldexp(l.place[i][a], k);
    for (int a = 0; a < 3; a++) {
      l.domain.period[a] = ldexp(l.domain.period[a], k);
      l.domain.half[a] = ldexp(l.domain.half[a], k);
    }
    double(*scaled)[6] = matrices_of(&l, &scaled_fallbacks);
    ck_assert_int_eq(fallbacks, scaled_fallbacks);
    for (int32_t i = 0; i < l.pairs.rows; i++)
      for (int d = 0; d < 6; d++)
        ck_assert(scaled[i][d] == ldexp(inverse[i][d], k * (l.domain.dim - 2)));
    free(scaled);
    free(inverse);
    lists_destroy(&l);
  }
}
END_TEST

/* ---- degenerate sets ---- */

/* Puts particles about the origin at a u + b v + thickness c w with whole a, b, c that
 * alternate. */
static lists flat_set(int dim, int32_t n, const double basis[3][3], const double width[3]) {
  lists l = lists_create(lists_box(dim, 0), n);
  uint64_t state = 9;
  for (int32_t i = 0; i < n; i++) {
    for (int k = 0; k < 3; k++) {
      state = state * UINT64_C(6364136223846793005) + UINT64_C(1442695040888963407); /* Knuth */
      const double s = width[k] * (ldexp((double)(state >> 11), -52) - 1.0);
      for (int a = 0; a < dim; a++) l.place[i][a] += s * basis[k][a];
    }
    l.place[i][3] = 2.0;
  }
  lists_find(&l, n, 0);
  return l;
}

/* Every row fell back, to D / sum w r^2 on the diagonal (round-off of about 30 terms). */
static void assert_isotropic(const lists *l) {
  int32_t fallbacks;
  double(*inverse)[6] = matrices_of(l, &fallbacks);
  ck_assert_int_eq(fallbacks, l->n);
  for (int32_t i = 0; i < l->n; i++) {
    double m[3][3];
    moments(l, i, m);
    const double expected = l->domain.dim / (m[0][0] + m[1][1] + m[2][2]);
    const double zz = l->domain.dim == 3 ? expected : 0.0;
    const double full[6] = {expected, 0, 0, expected, 0, zz};
    for (int d = 0; d < 6; d++)
      ck_assert_double_eq_tol(inverse[i][d], full[d], 1e-14 * expected);
  }
  free(inverse);
}

static int32_t fallbacks_of(const lists *l) {
  int32_t fallbacks;
  free(matrices_of(l, &fallbacks));
  return fallbacks;
}

/* A tilted orthonormal basis: rounding must not pass for thickness. */
static const double tilted[3][3] = {
    {2. / 3, 2. / 3, 1. / 3}, {-2. / 3, 1. / 3, 2. / 3}, {1. / 3, -2. / 3, 2. / 3}};
static const double tilted_2d[3][3] = {{0.6, 0.8, 0}, {-0.8, 0.6, 0}, {0, 0, 0}};
static const double straight[3][3] = {{1, 0, 0}, {0, 1, 0}, {0, 0, 1}};

START_TEST(lines_and_planes_fall_back) {
  static const double line[3] = {0.5, 0, 0}, plane[3] = {0.5, 0.5, 0};
  lists set[6] = {
      flat_set(2, 30, tilted_2d, line), flat_set(2, 30, straight, line),
      flat_set(3, 30, tilted, line),    flat_set(3, 30, straight, line),
      flat_set(3, 30, tilted, plane),   flat_set(3, 30, straight, plane),
  };
  for (int k = 0; k < 6; k++) {
    assert_isotropic(&set[k]);
    lists_destroy(&set[k]);
  }
}
END_TEST

/* The limit is a thickness of about 1% of the width: well above it every gradient is the full
 * one, well below none is; a collinear set must not pass by the rounding noise in its
 * determinant. */
START_TEST(thickness_decides) {
  static const struct {
    double width[3];
    bool full;
  } row[] = {{{0.5, 0.5, 0.03}, true},    {{0.5, 0.03, 0.03}, true},
             {{0.5, 0.5, 0.0005}, false}, {{0.5, 0.3, 1e-6}, false},
             {{0.5, 1e-5, 1e-5}, false},  {{0.5, 1e-8, 1e-8}, false},
             {{0.5, 1e-9, 1e-15}, false}, {{0.5, 1e-12, 1e-12}, false}};
  for (size_t k = 0; k < sizeof row / sizeof row[0]; k++) {
    lists l = flat_set(3, 30, tilted, row[k].width);
    ck_assert_int_eq(fallbacks_of(&l), row[k].full ? 0 : l.n);
    lists_destroy(&l);
  }
}
END_TEST

/* No neighbour inside the own support: a zero inverse, counted. Here a lone particle, one that
 * only a neighbour's support reaches, and two in one place. */
START_TEST(rows_without_neighbours_have_a_zero_inverse) {
  for (int dim = 2; dim <= 3; dim++) {
    lists l = lists_create(lists_box(dim, 0), 6);
    static const double place[6][4] = {{-0.9, -0.9, 0, 0.1}, {0.0, 0, 0, 0.1},
                                       {0.3, 0, 0, 0.4},     {0.3, 0.2, 0, 0.4},
                                       {0.8, 0.8, 0, 0.1},   {0.8, 0.8, 0, 0.1}};
    memcpy(l.place, place, sizeof place);
    lists_find(&l, 6, 0);
    ck_assert_int_eq(l.pairs.count[0], 0);
    ck_assert_int_gt(l.pairs.count[1], 0);
    int32_t fallbacks;
    double(*inverse)[6] = matrices_of(&l, &fallbacks);
    const bool zero[6] = {true, true, false, false, true, true};
    for (int32_t i = 0; i < 6; i++)
      for (int d = 0; d < 6; d++) ck_assert(!zero[i] || inverse[i][d] == 0.0);
    /* Rows 2 and 3 see a triangle: enough in 2-D for one of them, a plane in 3-D. */
    ck_assert_int_eq(fallbacks, dim == 2 ? 4 + (inverse[3][1] == 0.0) : 6);
    free(inverse);
    lists_destroy(&l);
  }
}
END_TEST

START_TEST(no_rows_is_no_work) {
  lists l = lists_create(lists_box(3, 7), 0);
  lists_find(&l, 0, 0);
  ck_assert_int_eq(fallbacks_of(&l), 0);
  lists_destroy(&l);
}
END_TEST

int main(void) {
  Suite *suite = suite_create("gradient");
  TCase *tc = tcase_create("random");
  tcase_add_loop_test(tc, linear_fields_are_exact, 0, BOXES);
  tcase_add_loop_test(tc, inverses_match_gsl, 0, BOXES);
  tcase_add_loop_test(tc, coefficients_follow_the_formula, 0, BOXES);
  tcase_add_loop_test(tc, padding_and_pieces_change_no_bit, 0, BOXES);
  tcase_add_loop_test(tc, mirrored_particles_give_opposite_gradients, 0, BOXES);
  tcase_add_loop_test(tc, units_do_not_matter, 0, BOXES);
  suite_add_tcase(suite, tc);
  tc = tcase_create("degenerate");
  tcase_add_test(tc, lines_and_planes_fall_back);
  tcase_add_test(tc, thickness_decides);
  tcase_add_test(tc, rows_without_neighbours_have_a_zero_inverse);
  tcase_add_test(tc, no_rows_is_no_work);
  suite_add_tcase(suite, tc);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  return failed != 0;
}
