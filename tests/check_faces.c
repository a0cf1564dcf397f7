/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_faces.c: faces against their formulas, the conditions they are asked to keep, and the
 * smallest change by GSL's singular values; sweeps against Chebyshev's polynomials. */
#include "faces.h"

#include "web.h"

#include <check.h>
#include <gsl/gsl_blas.h>
#include <gsl/gsl_linalg.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

/* 144 and 216 particles; 20 to 25 neighbours in 2-D, 40 to 50 in 3-D. */
static const web_plan plans[] = {
    {2, 3, 12, 0.2, 2.6, 0}, {2, 3, 13, 1.0, 2.6, 0}, {2, 1, 12, 0.5, 2.6, 0},
    {3, 7, 6, 0.2, 2.3, 0},  {3, 7, 6, 1.0, 2.3, 0},  {3, 3, 6, 0.5, 2.3, 0},
};
enum { PLANS = sizeof plans / sizeof plans[0] };

/* Unit roundoff of float. */
static const double ulp = 0x1p-24;

static void entry(float *const column[3], int64_t k, double v[3]) {
  for (int d = 0; d < 3; d++) v[d] = column[d][k];
}

static double length(const double v[3]) {
  return sqrt(v[0] * v[0] + v[1] * v[1] + v[2] * v[2]);
}

/* ---- raw faces ---- */

static void both_ends_agree(const web *w) {
  const wend_pairs *p = &w->l.pairs;
  for (int32_t i = 0; i < p->rows; i++)
    for (int32_t m = 0; m < p->count[i]; m++) {
      const int64_t k = wend_pairs_entry(p, i, m), twin = web_twin(w, i, k);
      ck_assert(twin >= 0);
      ck_assert(w->faces.weight[k] > 0);
      ck_assert(web_same_float(w->faces.weight[k], w->faces.weight[twin]));
      for (int d = 0; d < 3; d++) {
        ck_assert(w->faces.area[d][k] == -w->faces.area[d][twin]);
        ck_assert(w->faces.arm[d][k] == -w->faces.arm[d][twin]);
      }
    }
}

START_TEST(faces_are_antisymmetric_to_the_bit) {
  web w = web_create(&plans[_i], 1);
  both_ends_agree(&w);
  web_sweep(&w, 0.1, 12);
  wend_faces_apply(&w.l.pairs, w.l.all, &w.faces, (const double(*)[4])w.unknown);
  both_ends_agree(&w);
  web_destroy(&w);
}
END_TEST

/* W(r, H) of Wendland C2, written out: 7/pi and 21/(2 pi) times (1-q)^4 (1+4q) over H^D. */
static double kernel(int dim, double r, double h) {
  const double q = r / h;
  const double norm = dim == 2 ? 7 / M_PI : 21 / (2 * M_PI);
  return q < 1 ? norm * pow(1 - q, 4) * (1 + 4 * q) / pow(h, dim) : 0;
}

/* M^-1 r w by Gauss elimination of GSL, from the moments of all particles. */
static void gradient_weight(const web *w, int32_t i, const double r[3], double weight,
                            double c[3]) {
  const int dim = w->l.domain.dim;
  gsl_matrix *m = gsl_matrix_calloc((size_t)dim, (size_t)dim);
  gsl_vector *x = gsl_vector_alloc((size_t)dim);
  gsl_permutation *order = gsl_permutation_alloc((size_t)dim);
  int sign;
  for (int32_t j = 0; j < w->l.n; j++) {
    double arm[3] = {0};
    for (int a = 0; a < dim; a++)
      arm[a] = wend_domain_wrap(&w->l.domain, a, w->l.place[j][a] - w->l.place[i][a]);
    const double wij = kernel(dim, length(arm), w->l.place[i][3]);
    for (int a = 0; a < dim * dim; a++)
      m->data[(size_t)(a / dim) * m->tda + (size_t)(a % dim)] +=
          wij * arm[a / dim] * arm[a % dim];
  }
  gsl_linalg_LU_decomp(m, order, &sign);
  gsl_vector_const_view b = gsl_vector_const_view_array(r, (size_t)dim);
  gsl_linalg_LU_solve(m, order, &b.vector, x);
  for (int a = 0; a < dim; a++) c[a] = weight * gsl_vector_get(x, (size_t)a);
  gsl_matrix_free(m);
  gsl_vector_free(x);
  gsl_permutation_free(order);
}

/* Rounding to float, and 1e-10 of either half for the condition of the moments (1e4 at most
 * where the inverse is used) and another order of sums. */
static void face_follows_formula(const web *w, int32_t i, int64_t k) {
  const int dim = w->l.domain.dim;
  const int32_t j = w->l.pairs.index[k];
  double r[3] = {0}, back[3], ci[3] = {0}, cj[3] = {0};
  for (int a = 0; a < dim; a++)
    r[a] = wend_domain_wrap(&w->l.domain, a, w->l.place[j][a] - w->l.place[i][a]);
  for (int a = 0; a < 3; a++) back[a] = -r[a];
  const double hi = w->l.place[i][3], hj = w->l.place[j][3];
  const double wi = kernel(dim, length(r), hi), wj = kernel(dim, length(r), hj);
  gradient_weight(w, i, r, wi, ci);
  gradient_weight(w, j, back, wj, cj);
  const double vi = w->volume[i], vj = w->volume[j];
  for (int a = 0; a < dim; a++) {
    const double area = vi * ci[a] - vj * cj[a];
    const double give = 1e-10 * (vi * length(ci) + vj * length(cj));
    ck_assert_double_eq_tol(w->faces.area[a][k], area, ulp * fabs(area) + give);
    ck_assert(w->faces.arm[a][k] == (float)r[a]);
  }
  const double omega = (wi + wj) * (vi + vj) / (hi * hi + hj * hj);
  ck_assert_double_eq_tol(w->faces.weight[k], omega, 1.1 * ulp * omega);
  for (int a = dim; a < 3; a++) ck_assert(w->faces.area[a][k] == 0 && w->faces.arm[a][k] == 0);
}

START_TEST(raw_faces_follow_the_formula) {
  const web_plan plan = plans[_i];
  web w = web_create(&plan, 2);
  for (int32_t i = 0; i < w.l.n; i += 5)
    for (int32_t m = 0; m < w.l.pairs.count[i]; m++)
      face_follows_formula(&w, i, wend_pairs_entry(&w.l.pairs, i, m));
  web_destroy(&w);
}
END_TEST

/* Sums by the definitions, in another order than list order: rounding of double. */
START_TEST(sums_follow_the_formulas) {
  web w = web_create(&plans[_i], 3);
  const wend_pairs *p = &w.l.pairs;
  web_sweep(&w, 0.1, 3);
  double(*residual)[4] = web_residual(&w);
  double *extent = calloc((size_t)w.l.n, sizeof *extent);
  wend_faces_extent(p, w.l.all, &w.faces, (const double(*)[4])w.unknown, extent);
  for (int32_t i = 0; i < p->rows; i++) {
    double sum[4] = {0}, total = 0, jacobi[2] = {0};
    for (int32_t m = p->count[i] - 1; m >= 0; m--) {
      const int64_t k = wend_pairs_entry(p, i, m);
      const int32_t j = p->index[k];
      double a[3], r[3];
      entry(w.faces.area, k, a);
      entry(w.faces.arm, k, r);
      for (int d = 0; d < 3; d++) {
        a[d] += w.faces.weight[k] * (w.unknown[i][d] - w.unknown[j][d] +
                                     (w.unknown[i][3] + w.unknown[j][3]) * r[d]);
        sum[d] += a[d];
        sum[3] += a[d] * r[d];
      }
      total += length(a);
      jacobi[0] += w.faces.weight[k];
      jacobi[1] += w.faces.weight[k] * length(r) * length(r);
    }
    for (int d = 0; d < 3; d++) ck_assert_double_eq_tol(residual[i][d], -sum[d], 1e-14 * total);
    const double volume = 2 * w.l.domain.dim * w.volume[i];
    ck_assert_double_eq_tol(residual[i][3], volume - sum[3], 1e-14 * (fabs(sum[3]) + volume));
    ck_assert_double_eq_tol(extent[i], total, 1e-14 * total);
    ck_assert_double_eq_tol(w.diagonal[i][0], jacobi[0], 1e-14 * jacobi[0]);
    /* The column of arms is float, the diagonal was summed in double. */
    ck_assert_double_eq_tol(w.diagonal[i][1], jacobi[1], 4 * ulp * jacobi[1]);
  }
  free(residual);
  free(extent);
  web_destroy(&w);
}
END_TEST

START_TEST(padding_changes_no_bit) {
  web_plan padded = plans[_i];
  padded.extra = 5;
  web w = web_create(&plans[_i], 4), v = web_create(&padded, 4);
  web_sweep(&w, 0.1, 6);
  web_sweep(&v, 0.1, 6);
  double(*rw)[4] = web_residual(&w), (*rv)[4] = web_residual(&v);
  const size_t n = (size_t)w.l.n;
  ck_assert(memcmp(w.diagonal, v.diagonal, n * sizeof *w.diagonal) == 0);
  ck_assert(memcmp(w.unknown, v.unknown, n * sizeof *w.unknown) == 0);
  ck_assert(memcmp(rw, rv, n * sizeof *rw) == 0);
  wend_faces_apply(&v.l.pairs, v.l.all, &v.faces, (const double(*)[4])v.unknown);
  for (int32_t i = 0; i < v.l.pairs.slices * WEND_LANES; i++) {
    const int32_t width = wend_pairs_width(&v.l.pairs, i / WEND_LANES);
    for (int32_t m = i < v.l.n ? v.l.pairs.count[i] : 0; m < width; m++) {
      const int64_t k = wend_pairs_entry(&v.l.pairs, i, m);
      ck_assert(v.faces.weight[k] == 0);
      for (int d = 0; d < 3; d++) ck_assert(v.faces.area[d][k] == 0 && v.faces.arm[d][k] == 0);
    }
  }
  free(rw);
  free(rv);
  web_destroy(&w);
  web_destroy(&v);
}
END_TEST

/* ---- both conditions ---- */

/* Worst miss of both conditions off the surface, in units of what rounding to float leaves: an
 * area is wrong by up to ulp |A|, so sums are by ulp sum |A| and ulp sum |A| |r|. */
static double worst_miss(const web *w) {
  const wend_pairs *p = &w->l.pairs;
  double worst = 0;
  for (int32_t i = 0; i < p->rows; i++) {
    double sum[3] = {0}, span = 0, extent = 0, reach = 0;
    for (int32_t m = 0; m < p->count[i] && !w->surface[i]; m++) {
      double a[3], r[3];
      entry(w->faces.area, wend_pairs_entry(p, i, m), a);
      entry(w->faces.arm, wend_pairs_entry(p, i, m), r);
      for (int d = 0; d < 3; d++) {
        sum[d] += a[d];
        span += a[d] * r[d];
      }
      extent += length(a);
      reach += length(a) * length(r);
    }
    if (w->surface[i]) continue;
    worst = fmax(worst, length(sum) / (ulp * extent));
    worst = fmax(worst, fabs(span - 2 * w->l.domain.dim * w->volume[i]) / (ulp * reach));
  }
  return worst;
}

START_TEST(both_conditions_hold_to_float_precision) {
  web w = web_create(&plans[_i], 5);
  const double before = worst_miss(&w);
  web_sweep(&w, 0.01, 800);
  wend_faces_apply(&w.l.pairs, w.l.all, &w.faces, (const double(*)[4])w.unknown);
  const double after = worst_miss(&w);
  ck_assert_double_gt(before, 1e4);
  ck_assert_double_le(after, 1);
  web_destroy(&w);
}
END_TEST

/* ---- the smallest change ---- */

/* Smallest sum of |dA|^2 / omega over pairs under both conditions off the surface: unknowns x =
 * dA / sqrt(omega) a pair (i < j) and axis, conditions C x = residual, x = C^+ residual. */
typedef struct least {
  size_t pairs, unknowns, conditions;
  int64_t *entry; /* [pairs] */
  gsl_matrix *transposed;
  gsl_vector *right, *x;
} least;

static size_t condition(const web *w, int32_t i, int d) {
  const int dim = w->l.domain.dim;
  return (size_t)(i * (dim + 1) + d);
}

static void fill_least(const web *w, least *q) {
  const wend_pairs *p = &w->l.pairs;
  const int dim = w->l.domain.dim;
  size_t pair = 0;
  for (int32_t i = 0; i < p->rows; i++)
    for (int32_t m = 0; m < p->count[i]; m++) {
      const int64_t k = wend_pairs_entry(p, i, m);
      const int32_t j = p->index[k];
      if (j < i) continue;
      const double root = sqrt(w->faces.weight[k]);
      for (int d = 0; d < dim; d++) {
        const size_t row = pair * (size_t)dim + (size_t)d;
        const double on[2] = {w->surface[i] ? 0 : root, w->surface[j] ? 0 : root};
        gsl_matrix_set(q->transposed, row, condition(w, i, d), on[0]);
        gsl_matrix_set(q->transposed, row, condition(w, j, d), -on[1]);
        gsl_matrix_set(q->transposed, row, condition(w, i, dim), on[0] * w->faces.arm[d][k]);
        gsl_matrix_set(q->transposed, row, condition(w, j, dim), on[1] * w->faces.arm[d][k]);
      }
      q->entry[pair++] = k;
    }
}

static least least_create(const web *w) {
  const wend_pairs *p = &w->l.pairs;
  const int dim = w->l.domain.dim;
  least q = {.conditions = (size_t)(w->l.n * (dim + 1))};
  for (int32_t i = 0; i < p->rows; i++) q.pairs += (size_t)p->count[i];
  q.pairs /= 2;
  q.unknowns = q.pairs * (size_t)dim;
  q.entry = calloc(q.pairs, sizeof *q.entry);
  q.transposed = gsl_matrix_calloc(q.unknowns, q.conditions);
  q.right = gsl_vector_calloc(q.conditions);
  q.x = gsl_vector_calloc(q.unknowns);
  fill_least(w, &q);
  double(*residual)[4] = web_residual(w);
  for (int32_t i = 0; i < w->l.n; i++)
    for (int d = 0; d <= dim && !w->surface[i]; d++)
      gsl_vector_set(q.right, condition(w, i, d), residual[i][d < dim ? d : 3]);
  free(residual);
  return q;
}

/* x = U S^+ V^T right; singular values that symmetry makes zero (l may be shifted as a whole;
 * surface rows have no condition) come out below 1e-12 of the largest. */
static void least_solve(least *q) {
  gsl_matrix *v = gsl_matrix_alloc(q->conditions, q->conditions);
  gsl_vector *s = gsl_vector_alloc(q->conditions), *work = gsl_vector_alloc(q->conditions);
  gsl_linalg_SV_decomp(q->transposed, v, s, work);
  gsl_blas_dgemv(CblasTrans, 1, v, q->right, 0, work);
  for (size_t k = 0; k < q->conditions; k++) {
    const double value = gsl_vector_get(s, k);
    const bool zero = value < 1e-12 * gsl_vector_get(s, 0);
    gsl_vector_set(work, k, zero ? 0 : gsl_vector_get(work, k) / value);
  }
  gsl_blas_dgemv(CblasNoTrans, 1, q->transposed, work, 0, q->x);
  gsl_matrix_free(v);
  gsl_vector_free(s);
  gsl_vector_free(work);
}

static void least_destroy(least *q) {
  free(q->entry);
  gsl_matrix_free(q->transposed);
  gsl_vector_free(q->right);
  gsl_vector_free(q->x);
}

static const web_plan small[] = {
    {2, 3, 6, 0.2, 2.2, 0},
    {2, 3, 6, 1.0, 2.2, 0},
    {2, 1, 7, 0.3, 2.2, 0},
    {3, 7, 3, 0.4, 1.2, 0},
};
enum { SMALL = sizeof small / sizeof small[0] };

/* Rounding to float, and 1e-9 of the largest area for singular values down to 1e-4. */
START_TEST(sweeps_find_the_smallest_change) {
  web w = web_create(&small[_i], 6);
  const int dim = w.l.domain.dim;
  least q = least_create(&w);
  least_solve(&q);
  double *expected = calloc(q.unknowns, sizeof *expected), largest = 0, change = 0;
  for (size_t k = 0; k < q.unknowns; k++) {
    const int64_t e = q.entry[k / (size_t)dim];
    const double add = sqrt(w.faces.weight[e]) * gsl_vector_get(q.x, k);
    expected[k] = w.faces.area[k % (size_t)dim][e] + add;
    largest = fmax(largest, fabs(expected[k]));
    change = fmax(change, fabs(add));
  }
  web_sweep(&w, 0.003, 1500);
  wend_faces_apply(&w.l.pairs, w.l.all, &w.faces, (const double(*)[4])w.unknown);
  for (size_t k = 0; k < q.unknowns; k++) {
    const double found = w.faces.area[k % (size_t)dim][q.entry[k / (size_t)dim]];
    ck_assert_double_eq_tol(found, expected[k], ulp * fabs(expected[k]) + 1e-9 * largest);
  }
  ck_assert_double_gt(change, 0.01 * largest);
  free(expected);
  least_destroy(&q);
  web_destroy(&w);
}
END_TEST

/* ---- sweeps ---- */

/* T_n(x) outside and inside [-1, 1]. */
static double chebyshev_polynomial(int n, double x) {
  return fabs(x) <= 1 ? cos(n * acos(x)) : pow(x < 0 ? -1 : 1, n) * cosh(n * acosh(fabs(x)));
}

/* Rows that do not see each other, row i with eigenvalue lambda_i: after n sweeps the error is
 * T_n((theta - lambda)/delta) / T_n(theta/delta) of what it was (Saad 2003, section 6.11), at
 * most 1/T_n(theta/delta) within the range. 40 sweeps of rounding. */
START_TEST(sweeps_follow_chebyshev_polynomials) {
  enum { ROWS = 64, SWEEPS = 40 };
  const double lowest = 0.1, highest = 4, both[2] = {1, 1};
  double diagonal[ROWS][2], residual[ROWS][4], direction[ROWS][4] = {{0}};
  double unknown[ROWS][4] = {{0}}, lambda[ROWS];
  unsigned char surface[ROWS] = {0};
  for (int i = 0; i < ROWS; i++) {
    lambda[i] = 0.01 + i * 4.2 / ROWS;
    diagonal[i][0] = 1 + i;
    diagonal[i][1] = 1.0 / (1 + i);
  }
  wend_chebyshev chebyshev = wend_chebyshev_begin(lowest, highest);
  for (int n = 1; n <= SWEEPS; n++) {
    for (int i = 0; i < ROWS; i++)
      for (int d = 0; d < 4; d++)
        residual[i][d] = diagonal[i][d / 3] * lambda[i] * (1 + d - unknown[i][d]);
    wend_faces_update(ROWS, &chebyshev, both, (const double(*)[2])diagonal,
                      (const double(*)[4])residual, surface, direction, unknown);
    wend_chebyshev_next(&chebyshev);
    const double top = chebyshev_polynomial(n, (highest + lowest) / (highest - lowest));
    for (int i = 0; i < ROWS; i++) {
      const double z = (highest + lowest - 2 * lambda[i]) / (highest - lowest);
      const double share = chebyshev_polynomial(n, z) / top;
      const bool inside = lambda[i] >= lowest && lambda[i] <= highest;
      for (int d = 0; d < 4; d++) {
        const double error = (1 + d - unknown[i][d]) / (1 + d);
        ck_assert_double_eq_tol(error, share, 1e-12 * fmax(1, fabs(share)));
        ck_assert(!inside || fabs(error) <= (1 + 1e-9) / top + 1e-12);
      }
    }
  }
}
END_TEST

START_TEST(surface_rows_stay_at_zero) {
  web w = web_create(&plans[_i], 7);
  int marked = 0;
  web_sweep(&w, 0.1, 12);
  for (int32_t i = 0; i < w.l.n; i++) {
    marked += w.surface[i];
    for (int d = 0; d < 4; d++) {
      if (w.surface[i]) ck_assert(w.unknown[i][d] == 0);
      if (!w.surface[i] && (d < w.l.domain.dim || d == 3)) ck_assert(w.unknown[i][d] != 0);
    }
  }
  ck_assert((plans[_i].periodic != (1u << plans[_i].dim) - 1u) == (marked > 0));
  web_destroy(&w);
}
END_TEST

START_TEST(each_condition_can_be_switched_off) {
  web w = web_create(&plans[0], 8);
  double(*direction)[4] = calloc((size_t)w.l.n, sizeof *direction);
  double(*residual)[4] = web_residual(&w);
  const wend_chebyshev chebyshev = wend_chebyshev_begin(0.1, 4);
  for (int on = 0; on < 2; on++) {
    const double scale[2] = {on == 0, on == 1};
    memset(w.unknown, 0, (size_t)w.l.n * sizeof *w.unknown);
    wend_faces_update(w.l.n, &chebyshev, scale, (const double(*)[2])w.diagonal,
                      (const double(*)[4])residual, w.surface, direction, w.unknown);
    for (int32_t i = 0; i < w.l.n; i++) {
      ck_assert((w.unknown[i][0] != 0) == (on == 0));
      ck_assert((w.unknown[i][3] != 0) == (on == 1));
    }
  }
  free(direction);
  free(residual);
  web_destroy(&w);
}
END_TEST

/* A lone particle has no faces and no diagonal: nothing to divide by. */
START_TEST(lone_particles_are_left_alone) {
  const web_plan lone = {3, 7, 1, 0.2, 0.3, 0};
  web w = web_create(&lone, 9);
  web_sweep(&w, 0.1, 4);
  for (int d = 0; d < 4; d++) ck_assert(w.unknown[0][d] == 0);
  web_destroy(&w);
}
END_TEST

int main(void) {
  Suite *suite = suite_create("faces");
  TCase *tc = tcase_create("formulas");
  tcase_add_loop_test(tc, faces_are_antisymmetric_to_the_bit, 0, PLANS);
  tcase_add_loop_test(tc, raw_faces_follow_the_formula, 0, PLANS);
  tcase_add_loop_test(tc, sums_follow_the_formulas, 0, PLANS);
  tcase_add_loop_test(tc, padding_changes_no_bit, 0, PLANS);
  suite_add_tcase(suite, tc);
  tc = tcase_create("conditions");
  tcase_add_loop_test(tc, both_conditions_hold_to_float_precision, 0, PLANS);
  tcase_add_loop_test(tc, sweeps_find_the_smallest_change, 0, SMALL);
  suite_add_tcase(suite, tc);
  tc = tcase_create("sweeps");
  tcase_add_test(tc, sweeps_follow_chebyshev_polynomials);
  tcase_add_loop_test(tc, surface_rows_stay_at_zero, 0, PLANS);
  tcase_add_test(tc, each_condition_can_be_switched_off);
  tcase_add_test(tc, lone_particles_are_left_alone);
  suite_add_tcase(suite, tc);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  return failed != 0;
}
