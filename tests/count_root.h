/* SPDX-License-Identifier: GPL-3.0-or-later
 * count_root.h: the support that holds a target number, found without the library. */
#ifndef WEND_TESTS_COUNT_ROOT_H
#define WEND_TESTS_COUNT_ROOT_H

#include <stdint.h>

/** N(h) = (unit-ball volume) sum_j f(r_j/h) for a smoothing kernel by name, by its formula. */
double count_number(const char *kernel, int dim, double h, int32_t n, const double *r);

/** The h within (below, above) where N(h) = target, by GSL's Brent solver to 1e-14. */
double count_root(const char *kernel, int dim, double target, int32_t n, const double *r,
                  double below, double above);

#endif
