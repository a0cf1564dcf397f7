/* SPDX-License-Identifier: GPL-3.0-or-later
 * count_root.c: the support that holds a target number, found without the library. */
#include "count_root.h"

#include <gsl/gsl_errno.h>
#include <gsl/gsl_math.h>
#include <gsl/gsl_roots.h>
#include <string.h>

/* f(q), normalised; Dehnen & Aly 2012, table 1, and for the cubic spline Monaghan & Lattanzio
 * 1985 with support 1 (2-D norm 40/(7 pi) for this form, by integration). */
static double shape(const char *kernel, int dim, double q) {
  const double p = 1.0 - q;
  if (q >= 1.0) return 0.0;
  if (strcmp(kernel, "wendland-c2") == 0)
    return (dim == 3 ? 21.0 / (2.0 * M_PI) : 7.0 / M_PI) * gsl_pow_4(p) * (1.0 + 4.0 * q);
  if (strcmp(kernel, "wendland-c4") == 0)
    return (dim == 3 ? 495.0 / (32.0 * M_PI) : 9.0 / M_PI) * gsl_pow_6(p) *
           (1.0 + 6.0 * q + 35.0 / 3.0 * q * q);
  const double inner = q < 0.5 ? gsl_pow_3(0.5 - q) : 0.0;
  return (dim == 3 ? 16.0 / M_PI : 80.0 / (7.0 * M_PI)) * (gsl_pow_3(p) - 4.0 * inner);
}

double count_number(const char *kernel, int dim, double h, int32_t n, const double *r) {
  double sum = 0.0;
  for (int32_t j = 0; j < n; j++) sum += shape(kernel, dim, r[j] / h);
  return (dim == 3 ? 4.0 / 3.0 * M_PI : M_PI) * sum;
}

typedef struct task {
  const char *kernel;
  int dim;
  double target;
  int32_t n;
  const double *r;
} task;

static double excess(double h, void *data) {
  const task *t = data;
  return count_number(t->kernel, t->dim, h, t->n, t->r) - t->target;
}

double count_root(const char *kernel, int dim, double target, int32_t n, const double *r,
                  double below, double above) {
  task t = {kernel, dim, target, n, r};
  gsl_function f = {excess, &t};
  gsl_root_fsolver *solver = gsl_root_fsolver_alloc(gsl_root_fsolver_brent);
  gsl_root_fsolver_set(solver, &f, below, above);
  int state = GSL_CONTINUE;
  for (int k = 0; k < 200 && state == GSL_CONTINUE; k++) {
    gsl_root_fsolver_iterate(solver);
    state = gsl_root_test_interval(gsl_root_fsolver_x_lower(solver),
                                   gsl_root_fsolver_x_upper(solver), 0.0, 1e-14);
  }
  const double root = gsl_root_fsolver_root(solver);
  gsl_root_fsolver_free(solver);
  return state == GSL_SUCCESS ? root : GSL_NAN;
}
