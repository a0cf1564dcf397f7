/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_domain.c: minimum-image differences against the C library's remainder. */
#include "domain.h"

#include "cloud.h"
#include "lists.h"

#include <check.h>
#include <stdlib.h>

/* remainder() is exact and the wrap rounds one subtraction, which is exact too (Sterbenz) where
 * the result is below half the period: no tolerance. At half a period either sign is nearest,
 * so the wrap's own rule counts there: left alone. */
START_TEST(differences_are_exact_remainders) {
  const double periods[3] = {2.0, 0.1, 3.3e24};
  uint64_t state = 4;
  for (int k = 0; k < 3; k++) {
    wend_domain d = lists_box(3, 7);
    d.period[1] = periods[k];
    d.half[1] = periods[k] / 2.0;
    for (int trial = 0; trial < 100000; trial++) {
      const double dx = periods[k] * (2.0 * cloud_random(&state) - 1.0);
      const double wrapped = wend_domain_wrap(&d, 1, dx);
      if (fabs(dx) != d.half[1]) ck_assert(wrapped == remainder(dx, periods[k]));
      ck_assert(wend_domain_wrap(&d, 1, -dx) == -wrapped);
    }
    ck_assert(wend_domain_wrap(&d, 1, d.half[1]) == d.half[1]);
    ck_assert(wend_domain_wrap(&d, 1, -d.half[1]) == -d.half[1]);
    ck_assert(wend_domain_wrap(&d, 1, periods[k]) == 0.0);
    ck_assert(wend_domain_wrap(&d, 1, -periods[k]) == 0.0);
    ck_assert(wend_domain_wrap(&d, 1, 0.0) == 0.0);
  }
}
END_TEST

START_TEST(axes_that_are_not_periodic_wrap_nothing) {
  const wend_domain d = lists_box(3, 0);
  const double differences[6] = {0.0, -0.0, 1.5, -1e300, 0x1p-1074, HUGE_VAL};
  for (int k = 0; k < 6; k++) {
    ck_assert(wend_domain_wrap(&d, 0, differences[k]) == differences[k]);
    ck_assert(signbit(wend_domain_wrap(&d, 0, differences[k])) == signbit(differences[k]));
  }
}
END_TEST

int main(void) {
  Suite *suite = suite_create("domain");
  TCase *tc = tcase_create("wrap");
  tcase_add_test(tc, differences_are_exact_remainders);
  tcase_add_test(tc, axes_that_are_not_periodic_wrap_nothing);
  suite_add_tcase(suite, tc);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  return failed != 0;
}
