/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_sum.c: the exact accumulator against long-hand arithmetic and the C library's rounding.
 */
#include "sum.h"

#include <check.h>
#include <float.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* ---- a small random generator (Vigna 2015, splitmix64), the same on every machine ---- */

static uint64_t draw(uint64_t *state) {
  uint64_t z = *state += UINT64_C(0x9e3779b97f4a7c15);
  z = (z ^ z >> 30) * UINT64_C(0xbf58476d1ce4e5b9);
  z = (z ^ z >> 27) * UINT64_C(0x94d049bb133111eb);
  return z ^ z >> 31;
}

/* Any finite double, all bit patterns alike: exponents over the whole range, subnormals too. */
static double draw_finite(uint64_t *state) {
  double x;
  do {
    const uint64_t bits = draw(state);
    memcpy(&x, &bits, sizeof x);
  } while (!isfinite(x));
  return x;
}

/* ---- long-hand reference: hexadecimal digits of 2^-1076, added as at school ---- */

enum { HEX = 560 };

/* Adds |x| to the digits; 2^-1074 is 4 units of 2^-1076, so that digits fall on multiples of 4.
 */
static void school_add(int digit[HEX], double x) {
  int exponent;
  uint64_t mantissa = (uint64_t)ldexp(frexp(fabs(x), &exponent), 53);
  int at = exponent - 53 + 1076;
  for (; at < 0; at++) mantissa >>= 1; /* only zeros leave: x is a multiple of 2^-1074 */
  for (int b = 0; b < 64 && mantissa >> b != 0; b++) {
    int carry = (int)(mantissa >> b & 1) << (at + b) % 4;
    for (int k = (at + b) / 4; carry != 0; k++) {
      const int total = digit[k] + carry;
      digit[k] = total % 16;
      carry = total / 16;
    }
  }
}

/* The larger minus the smaller, as text, through strtod: rounded by the C library. */
static double school_difference(const int plus[HEX], const int minus[HEX]) {
  int k = HEX - 1;
  while (k >= 0 && plus[k] == minus[k]) k--;
  const int swapped = k >= 0 && plus[k] < minus[k];
  const int *large = swapped ? minus : plus, *small = swapped ? plus : minus;
  char text[HEX + 16] = "0x", *end = text + 2 + HEX;
  int borrow = 0;
  for (int d = 0; d < HEX; d++) {
    const int left = large[d] - small[d] - borrow;
    borrow = left < 0;
    text[2 + HEX - 1 - d] = "0123456789abcdef"[left + 16 * borrow];
  }
  strcpy(end, "p-1076");
  return swapped ? -strtod(text, NULL) : strtod(text, NULL);
}

static double school_sum(int n, const double *x) {
  int plus[HEX] = {0}, minus[HEX] = {0};
  for (int i = 0; i < n; i++) school_add(signbit(x[i]) ? minus : plus, x[i]);
  return school_difference(plus, minus);
}

static double sum_of(int n, const double *x) {
  wend_sum sum;
  wend_sum_reset(&sum);
  wend_sum_add(&sum, n, x, 1);
  return wend_sum_value(&sum);
}

/* Equal as bits, so that signs of zero count; no tolerance: everything here is exact. */
static void assert_same(double a, double b) {
  ck_assert_msg(memcmp(&a, &b, sizeof a) == 0, "%a is not %a", a, b);
}

START_TEST(random_sums_equal_long_hand_sums) {
  enum { MOST = 300 };
  uint64_t state = 1;
  double x[MOST];
  for (int trial = 0; trial < 3000; trial++) {
    const int n = 1 + (int)(draw(&state) % MOST);
    const int kind = trial % 4;
    for (int i = 0; i < n; i++) {
      x[i] = draw_finite(&state);
      /* Kinds: whole range; a window of 60 binary orders; subnormal results; near overflow. */
      const int order = (int)(draw(&state) % 60);
      if (kind == 1) x[i] = ldexp(frexp(x[i], &(int){0}), order);
      if (kind == 2) x[i] = ldexp(frexp(x[i], &(int){0}), order - 1090);
      if (kind == 3) x[i] = ldexp(frexp(x[i], &(int){0}), 1024 - order % 3);
    }
    assert_same(sum_of(n, x), school_sum(n, x));
  }
}
END_TEST

/* A second way: integers times one power of two, summed in 128 bits, rounded by the compiler.
 */
START_TEST(window_sums_equal_128_bit_sums) {
  static const int base[5] = {-1074, -1030, -500, 0, 890};
  enum { N = 1000 };
  uint64_t state = 7;
  double x[N];
  for (int trial = 0; trial < 500; trial++) {
    __extension__ __int128 exact = 0;
    for (int i = 0; i < N; i++) {
      const int64_t m = (int64_t)draw(&state) >> 11;
      const int order = (int)(draw(&state) % 60);
      exact += (__extension__(__int128) m) * (INT64_C(1) << order);
      x[i] = ldexp((double)m, order + base[trial % 5]);
    }
    assert_same(sum_of(N, x), ldexp((double)exact, base[trial % 5]));
  }
}
END_TEST

START_TEST(order_and_split_do_not_matter) {
  enum { N = 5000, SHARES = 7 };
  static double x[N];
  uint64_t state = 3;
  wend_sum direct, permuted, added, merged, share[SHARES];
  for (int i = 0; i < N; i++) x[i] = draw_finite(&state);
  wend_sum_reset(&direct);
  wend_sum_add(&direct, N, x, 1);
  for (int i = N - 1; i > 0; i--) {
    const int j = (int)(draw(&state) % (uint64_t)(i + 1));
    const double held = x[i];
    x[i] = x[j];
    x[j] = held;
  }
  wend_sum_reset(&permuted);
  for (int i = 0; i < N; i++) wend_sum_add(&permuted, 1, &x[i], 1);
  ck_assert_mem_eq(&direct, &permuted, sizeof direct);

  wend_sum_reset(&merged);
  wend_sum_reset(&added);
  for (int k = 0; k < SHARES; k++) {
    wend_sum_reset(&share[k]);
    wend_sum_add(&share[k], (N - k + SHARES - 1) / SHARES, x + k, SHARES); /* every 7th */
    wend_sum_merge(&merged, &share[k]);
    for (int l = 0; l < WEND_SUM_LIMBS; l++)
      added.limb[l] += share[k].limb[l]; /* as MPI does */
  }
  wend_sum_normalise(&added);
  ck_assert_mem_eq(&direct, &merged, sizeof direct);
  ck_assert_mem_eq(&direct, &added, sizeof direct);
}
END_TEST

START_TEST(cancellation_leaves_what_is_left) {
  const double case_1[] = {1e308, 1.0, -1e308};
  const double case_2[] = {DBL_MAX, DBL_MAX, 0x1p-1074, -DBL_MAX, -DBL_MAX};
  const double case_3[] = {1e16, 1e-300, -1e16, -1e-300};
  const double case_4[] = {-DBL_MAX, 0x1p-1074, DBL_MAX, -0x1p-1074, -0x1p-1074};
  const double case_5[] = {0x1p-1074, 0x1p-1074, 0x1p-1074};
  const double case_6[] = {DBL_MIN, -0x1p-1074};
  assert_same(sum_of(3, case_1), 1.0);
  assert_same(sum_of(5, case_2), 0x1p-1074);
  assert_same(sum_of(4, case_3), 0.0);
  assert_same(sum_of(5, case_4), -0x1p-1074);
  assert_same(sum_of(3, case_5), 0x3p-1074);
  assert_same(sum_of(2, case_6), 0x0.fffffffffffffp-1022);
}
END_TEST

START_TEST(ties_go_to_even_and_nothing_is_rounded_twice) {
  static const struct {
    double x[3], sum;
  } row[] = {
      {{1.0, 0x1p-53, 0.0}, 1.0},
      {{1.0, 0x1p-53, 0x1p-1074}, 1.0 + 0x1p-52},
      {{1.0, 0x1p-53, -0x1p-1074}, 1.0},
      {{1.0 + 0x1p-52, 0x1p-53, 0.0}, 1.0 + 0x1p-51},
      {{1.0 + 0x1p-52, 0x1p-53, -0x1p-1074}, 1.0 + 0x1p-52},
      {{-1.0, -0x1p-53, -0x1p-1074}, -1.0 - 0x1p-52},
      {{1.0, -0x1p-54, 0.0}, 1.0},
      {{1.0, -0x1p-54, -0x1p-1074}, 1.0 - 0x1p-53},
      {{0x1.fffffffffffffp0, 0x1p-53, 0.0}, 2.0},
      {{DBL_MAX, 0x1p969, 0.0}, DBL_MAX},
      {{DBL_MAX, 0x1p970, -0x1p-1074}, DBL_MAX},
      {{DBL_MAX, 0x1p970, 0.0}, HUGE_VAL},
      {{-DBL_MAX, -0x1p970, 0.0}, -HUGE_VAL},
      {{DBL_MAX, DBL_MAX, DBL_MAX}, HUGE_VAL},
      {{DBL_MAX, DBL_MAX, -DBL_MAX}, DBL_MAX},
  };
  for (size_t k = 0; k < sizeof row / sizeof row[0]; k++) {
    const double minus[3] = {-row[k].x[0], -row[k].x[1], -row[k].x[2]};
    assert_same(sum_of(3, row[k].x), row[k].sum);
    assert_same(sum_of(3, minus), -row[k].sum);
  }
}
END_TEST

/* A tie is broken by a single bit wherever it lies below. */
START_TEST(any_lower_bit_breaks_a_tie) {
  for (int e = 54; e <= 1074; e++) {
    const double above[3] = {1.0, 0x1p-53, ldexp(1.0, -e)};
    const double below[3] = {1.0 + 0x1p-52, 0x1p-53, -ldexp(1.0, -e)};
    assert_same(sum_of(3, above), 1.0 + 0x1p-52);
    assert_same(sum_of(3, below), 1.0 + 0x1p-52);
  }
}
END_TEST

START_TEST(zeros_sum_to_plus_zero) {
  const double zeros[3] = {-0.0, 0.0, -0.0};
  assert_same(sum_of(0, NULL), 0.0);
  assert_same(sum_of(1, zeros), 0.0);
  assert_same(sum_of(3, zeros), 0.0);
}
END_TEST

START_TEST(terms_that_are_not_finite_are_flagged) {
  const double bad[3] = {(double)NAN, HUGE_VAL, -HUGE_VAL};
  const double good = 2.0;
  for (int k = 0; k < 3; k++) {
    wend_sum sum, total;
    wend_sum_reset(&sum);
    wend_sum_add(&sum, 1, &good, 1);
    wend_sum_add(&sum, 1, &bad[k], 1);
    ck_assert(isnan(wend_sum_value(&sum)));
    ck_assert_int_eq(sum.limb[WEND_SUM_LIMBS - 1], 1);
    wend_sum_reset(&total);
    wend_sum_merge(&total, &sum);
    wend_sum_merge(&total, &sum);
    ck_assert(isnan(wend_sum_value(&total)));
    ck_assert_int_eq(total.limb[WEND_SUM_LIMBS - 1], 2);
    wend_sum_reset(&total);
    assert_same(wend_sum_value(&total), 0.0);
  }
}
END_TEST

/* 2^40 terms of the largest size, by doubling, with one grain at the other end of the range. */
START_TEST(two_to_the_forty_largest_terms_fit) {
  const double largest = DBL_MAX, grain = -0x1p-1074;
  wend_sum up, down;
  wend_sum_reset(&up);
  wend_sum_reset(&down);
  wend_sum_add(&up, 1, &largest, 1);
  wend_sum_add(&down, 1, &(double){-largest}, 1);
  for (int k = 0; k < 40; k++) {
    const wend_sum up_before = up, down_before = down;
    wend_sum_merge(&up, &up_before);
    wend_sum_merge(&down, &down_before);
  }
  assert_same(wend_sum_value(&up), HUGE_VAL);
  assert_same(wend_sum_value(&down), -HUGE_VAL);
  wend_sum_add(&up, 1, &grain, 1);
  wend_sum_merge(&up, &down);
  assert_same(wend_sum_value(&up), grain);
}
END_TEST

/* Carries wait inside a call: four million full mantissas, whose exact sum is a product. */
START_TEST(long_runs_carry_exactly) {
  enum { N = 1 << 22 };
  double *x = malloc(N * sizeof *x);
  ck_assert_ptr_nonnull(x);
  for (int sign = -1; sign <= 1; sign += 2) {
    for (int i = 0; i < N; i++) x[i] = sign * 0x1.fffffffffffffp-3;
    assert_same(sum_of(N, x), sign * 0x1.fffffffffffffp-3 * N);
  }
  free(x);
}
END_TEST

START_TEST(stride_picks_terms) {
  const double x[6] = {1, 100, 2, 100, 3, 100};
  wend_sum sum;
  wend_sum_reset(&sum);
  wend_sum_add(&sum, 3, x, 2);
  assert_same(wend_sum_value(&sum), 6.0);
}
END_TEST

int main(void) {
  Suite *suite = suite_create("sum");
  TCase *tc = tcase_create("accumulator");
  tcase_set_timeout(tc, 60);
  tcase_add_test(tc, random_sums_equal_long_hand_sums);
  tcase_add_test(tc, window_sums_equal_128_bit_sums);
  tcase_add_test(tc, order_and_split_do_not_matter);
  tcase_add_test(tc, cancellation_leaves_what_is_left);
  tcase_add_test(tc, ties_go_to_even_and_nothing_is_rounded_twice);
  tcase_add_test(tc, any_lower_bit_breaks_a_tie);
  tcase_add_test(tc, zeros_sum_to_plus_zero);
  tcase_add_test(tc, terms_that_are_not_finite_are_flagged);
  tcase_add_test(tc, two_to_the_forty_largest_terms_fit);
  tcase_add_test(tc, long_runs_carry_exactly);
  tcase_add_test(tc, stride_picks_terms);
  suite_add_tcase(suite, tc);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  return failed != 0;
}
