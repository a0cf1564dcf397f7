/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_volume.c: volumes against sums by brute force and, on lattices, Poisson's summation
 * formula. */
#include "volume.h"

#include "lists.h"

#include <check.h>
#include <gsl/gsl_integration.h>
#include <gsl/gsl_math.h>
#include <gsl/gsl_sf_bessel.h>
#include <math.h>
#include <stdlib.h>

/* The caller frees. */
static double *volumes_of(const lists *l, const wend_smoothing *smoothing) {
  double *volume = calloc((size_t)l->n + 1, sizeof *volume);
  ck_assert_ptr_nonnull(volume);
  wend_volume_estimate(&l->pairs, l->all, &l->domain, smoothing, (const double(*)[4])l->place,
                       volume);
  return volume;
}

static double kernel_value(const wend_smoothing *smoothing, int dim, double r, double h) {
  const double q = r / h;
  double s;
  smoothing->shape(1, &q, &s);
  return smoothing->norm[dim - 2] * s / pow(h, dim);
}

/* 1/V_i with every particle and all images next to the box, without lists. */
static double density_by_force(const lists *l, const wend_smoothing *smoothing, int32_t i) {
  const wend_domain *d = &l->domain;
  double sum = 0.0;
  for (int32_t j = 0; j < l->n; j++)
    for (int image = 0; image < 27; image++) {
      const int shift[3] = {image % 3 - 1, image / 3 % 3 - 1, image / 9 - 1};
      double r2 = 0.0;
      bool twice = false;
      for (int a = 0; a < 3; a++) {
        const double x = l->place[j][a] - l->place[i][a] + shift[a] * d->period[a];
        twice = twice || (shift[a] != 0 && d->period[a] == 0.0);
        r2 += a < d->dim ? x * x : 0.0;
      }
      if (!twice) sum += kernel_value(smoothing, d->dim, sqrt(r2), l->place[i][3]);
    }
  return sum;
}

static const struct {
  int dim;
  unsigned periodic;
} boxes[] = {{2, 0}, {2, 3}, {2, 2}, {3, 0}, {3, 7}, {3, 3}};
enum { BOXES = sizeof boxes / sizeof boxes[0] };

/* Up to 100 positive terms, added in another order: 100 roundings of 1.1e-16 at worst. */
START_TEST(volumes_equal_brute_force) {
  for (int k = 0; k < 3; k++) {
    const wend_smoothing *smoothing = wend_smoothing_at(k);
    lists l = lists_create(lists_box(boxes[_i].dim, boxes[_i].periodic), 500);
    l.domain.thickness = boxes[_i].dim == 2 ? 0.25 : 1.0;
    lists_scatter(&l, boxes[_i].dim == 2 ? 0.28 : 0.6, 1 + (uint64_t)k);
    lists_find(&l, 437, k); /* not a multiple of 8; the rest are ghosts */
    double *volume = volumes_of(&l, smoothing);
    for (int32_t i = 0; i < l.pairs.rows; i++) {
      const double expected = l.domain.thickness / density_by_force(&l, smoothing, i);
      ck_assert_double_eq_tol(volume[i], expected, 1e-14 * expected);
    }
    for (int32_t i = l.pairs.rows; i < l.n; i++) ck_assert(volume[i] == 0.0);
    free(volume);
    lists_destroy(&l);
  }
}
END_TEST

/* ---- lattices ---- */

/* A square or cubic lattice of `side` particles an axis, shifted by a part of a cell. */
static lists lattice(int dim, int side, double support, double shift) {
  const int32_t n = dim == 2 ? side * side : side * side * side;
  lists l = lists_create(lists_box(dim, 7), n);
  for (int32_t i = 0; i < n; i++) {
    const int32_t cell[3] = {i % side, i / side % side, i / side / side};
    for (int a = 0; a < dim; a++) {
      const double x = l.domain.lo[a] + 2.0 * (cell[a] + 0.5 + shift) / side;
      l.place[i][a] = x < l.domain.hi[a] ? x : x - 2.0;
    }
    l.place[i][3] = support;
  }
  lists_find(&l, n, 0);
  return l;
}

typedef struct wave {
  const wend_smoothing *smoothing;
  double kh;
} wave;

static double in_plane(double q, void *context) {
  const wave *w = context;
  double s;
  w->smoothing->shape(1, &q, &s);
  return w->smoothing->norm[0] * s * 2.0 * M_PI * q * gsl_sf_bessel_J0(w->kh * q);
}

static double in_space(double q, void *context) {
  const wave *w = context;
  double s;
  w->smoothing->shape(1, &q, &s);
  return w->smoothing->norm[1] * s * 4.0 * M_PI * q * q * gsl_sf_bessel_j0(w->kh * q);
}

static double transform(const wend_smoothing *smoothing, int dim, double kh) {
  wave w = {smoothing, kh};
  gsl_function f = {dim == 2 ? in_plane : in_space, &w};
  gsl_integration_workspace *space = gsl_integration_workspace_alloc(200);
  double value, error;
  gsl_integration_qag(&f, 0.0, 1.0, 1e-13, 1e-13, 200, GSL_INTEG_GAUSS61, space, &value,
                      &error);
  gsl_integration_workspace_free(space);
  return value;
}

/* Poisson: (cell) sum_j W = sum over waves k = 2 pi m / spacing of W's transform, m whole
 * vectors. */
static double lattice_excess(const wend_smoothing *smoothing, int dim, double ratio) {
  enum { MOST = 32 };
  static int count[MOST * MOST + 1]; /* of vectors with this m^2 */
  double sum = 0.0;
  for (int k = 0; k <= MOST * MOST; k++) count[k] = 0;
  for (int x = -MOST; x <= MOST; x++)
    for (int y = -MOST; y <= MOST; y++)
      for (int z = dim == 2 ? 0 : -MOST; z <= (dim == 2 ? 0 : MOST); z++)
        if (x * x + y * y + z * z <= MOST * MOST) count[x * x + y * y + z * z]++;
  for (int k = 1; k <= MOST * MOST; k++)
    if (count[k] > 0) sum += count[k] * transform(smoothing, dim, 2.0 * M_PI * sqrt(k) * ratio);
  return sum;
}

/* 20 and 48 neighbours, the usual numbers: the kernel's own error on a lattice is known exactly
 * from its Fourier transform, and has nothing to do with lists. The transform of the C2 kernel
 * falls as 20 * 96 pi norm/(kH)^6 in 3-D (from its term 20 q^3), so that waves beyond m = 32
 * leave 4e-7, in 2-D 2e-7. */
START_TEST(lattice_volumes_are_off_by_the_known_error_only) {
  const wend_smoothing *smoothing = wend_smoothing_find("wendland-c2");
  for (int dim = 2; dim <= 3; dim++) {
    const int side = dim == 2 ? 16 : 10;
    const double spacing = 2.0 / side, cell = pow(spacing, dim);
    const double ratio = dim == 2 ? sqrt(20.0 / M_PI) : cbrt(48.0 * 3.0 / (4.0 * M_PI));
    const double excess = lattice_excess(smoothing, dim, ratio);
    lists l = lattice(dim, side, ratio * spacing, 0.0);
    double *volume = volumes_of(&l, smoothing);
    for (int32_t i = 0; i < l.n; i++)
      ck_assert_double_eq_tol(cell / volume[i], 1.0 + excess, 6e-7);
    free(volume);
    lists_destroy(&l);
  }
}
END_TEST

/* A lattice shifted through the border: each particle sees the same neighbours, some of them
 * images. Arms differ by the round-off of coordinates of order one over a support of 0.3:
 * 1e-15. */
START_TEST(periodic_borders_are_not_seen) {
  const wend_smoothing *smoothing = wend_smoothing_find("wendland-c4");
  for (int dim = 2; dim <= 3; dim++) {
    const double support = dim == 2 ? 0.32 : 0.46;
    lists l = lattice(dim, dim == 2 ? 16 : 10, support, 0.377);
    double *volume = volumes_of(&l, smoothing);
    for (int32_t i = 0; i < l.n; i++)
      ck_assert_double_eq_tol(volume[i], volume[0], 1e-14 * volume[0]);
    free(volume);
    lists_destroy(&l);
  }
}
END_TEST

/* A lone particle fills 1/W(0, H): exact up to the roundings of a product and two quotients. */
START_TEST(lone_particles_have_their_kernel_volume) {
  for (int dim = 2; dim <= 3; dim++)
    for (int k = 0; k < 3; k++) {
      const wend_smoothing *smoothing = wend_smoothing_at(k);
      lists l = lists_create(lists_box(dim, 0), 1);
      l.domain.thickness = dim == 2 ? 3.0 : 1.0;
      l.place[0][3] = 0.37;
      lists_find(&l, 1, 2);
      double *volume = volumes_of(&l, smoothing);
      const double expected = l.domain.thickness / kernel_value(smoothing, dim, 0.0, 0.37);
      ck_assert_double_eq_tol(volume[0], expected, 1e-15 * expected);
      free(volume);
      lists_destroy(&l);
    }
}
END_TEST

/* Particles in one place share it: n times the density. */
START_TEST(coincident_particles_share_their_volume) {
  const wend_smoothing *smoothing = wend_smoothing_find("wendland-c2");
  lists l = lists_create(lists_box(3, 0), 5);
  for (int32_t i = 0; i < l.n; i++) l.place[i][3] = 0.5;
  lists_find(&l, 5, 0);
  double *volume = volumes_of(&l, smoothing);
  for (int32_t i = 0; i < l.n; i++) {
    const double expected = 1.0 / (5.0 * kernel_value(smoothing, 3, 0.0, 0.5));
    ck_assert_double_eq_tol(volume[i], expected, 1e-15 * expected);
  }
  free(volume);
  lists_destroy(&l);
}
END_TEST

int main(void) {
  Suite *suite = suite_create("volume");
  TCase *tc = tcase_create("volumes");
  tcase_set_timeout(tc, 60);
  tcase_add_loop_test(tc, volumes_equal_brute_force, 0, BOXES);
  tcase_add_test(tc, lattice_volumes_are_off_by_the_known_error_only);
  tcase_add_test(tc, periodic_borders_are_not_seen);
  tcase_add_test(tc, lone_particles_have_their_kernel_volume);
  tcase_add_test(tc, coincident_particles_share_their_volume);
  suite_add_tcase(suite, tc);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  return failed != 0;
}
