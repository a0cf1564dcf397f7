/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_hilbert.c: keys along the curve: bijection, neighbourhood, nesting, borders. */
#include "hilbert.h"

#include <check.h>
#include <math.h>
#include <stdlib.h>

static const wend_domain square = {.dim = 2, .lo = {-3, 5, 0}, .hi = {5, 9, 0}, .thickness = 1};
static const wend_domain cube = {.dim = 3, .lo = {-3, 5, 0}, .hi = {5, 9, 0.5}, .thickness = 1};

static const wend_domain *domain_of(int dim) { return dim == 2 ? &square : &cube; }
static int bits_of(int dim) { return dim == 2 ? 31 : 21; }

/* The centre of a cell of the grid of 2^level cells an axis; exact, since widths are powers
 * of 2. */
static void centre(const wend_domain *d, int level, const uint32_t cell[3], double place[4]) {
  for (int a = 0; a < 3; a++)
    place[a] = d->lo[a] + (d->hi[a] - d->lo[a]) * ldexp(cell[a] + 0.5, -level);
  place[3] = (double)NAN; /* the fourth number is not read */
}

static uint64_t key_of(const wend_domain *d, const double place[4]) {
  const double copy[1][4] = {{place[0], place[1], place[2], place[3]}};
  uint64_t key;
  wend_hilbert_keys(d, 1, copy, &key);
  return key;
}

/* Every cell of a full grid, keyed at the grid's own level: keys are 0 .. cells - 1, each once,
 * and the next key is the next cell over one side: the two properties that define the curve. */
static void walk_full_grid(int dim, int level) {
  const wend_domain *d = domain_of(dim);
  const int32_t side = 1 << level, n = 1 << dim * level;
  double(*place)[4] = malloc((size_t)n * sizeof *place);
  uint64_t *key = malloc((size_t)n * sizeof *key);
  int32_t *at = malloc((size_t)n * sizeof *at);
  ck_assert(place != NULL && key != NULL && at != NULL);
  for (int32_t c = 0; c < n; c++) {
    const uint32_t cell[3] = {(uint32_t)(c % side), (uint32_t)(c / side % side),
                              (uint32_t)(c / side / side)};
    centre(d, level, cell, place[c]);
    at[c] = -1;
  }
  wend_hilbert_keys(d, n, (const double(*)[4])place, key);
  for (int32_t c = 0; c < n; c++) {
    const uint64_t coarse = key[c] >> dim * (bits_of(dim) - level);
    ck_assert_uint_lt(coarse, (uint64_t)n);
    ck_assert_int_eq(at[coarse], -1);
    at[coarse] = c;
  }
  for (int32_t k = 1; k < n; k++) {
    const int32_t a = at[k - 1], b = at[k];
    const int distance = abs(a % side - b % side) + abs(a / side % side - b / side % side) +
                         abs(a / side / side - b / side / side);
    ck_assert_int_eq(distance, 1);
  }
  free(at);
  free(key);
  free(place);
}

START_TEST(full_grids_are_walked_cell_by_cell) {
  for (int level = 1; level <= 8; level++) walk_full_grid(2, level);
  for (int level = 1; level <= 6; level++) walk_full_grid(3, level);
}
END_TEST

/* The inverse transform, bit by bit as published (Skilling 2004), from key to cell. */
static void decode(int dim, uint64_t key, uint32_t x[3]) {
  const int bits = bits_of(dim);
  x[0] = x[1] = x[2] = 0;
  for (int b = 0; b < bits * dim; b++)
    x[dim - 1 - b % dim] |= (uint32_t)(key >> b & 1) << b / dim;
  const uint32_t t = x[dim - 1] >> 1;
  for (int a = dim - 1; a > 0; a--) x[a] ^= x[a - 1];
  x[0] ^= t;
  for (uint32_t q = 2; q != UINT32_C(1) << bits; q <<= 1)
    for (int a = dim - 1; a >= 0; a--) {
      const uint32_t p = q - 1, swap = (x[0] ^ x[a]) & p;
      if (x[a] & q)
        x[0] ^= p;
      else {
        x[0] ^= swap;
        x[a] ^= swap;
      }
    }
}

static uint64_t draw(uint64_t *state) { /* Vigna 2015, splitmix64 */
  uint64_t z = *state += UINT64_C(0x9e3779b97f4a7c15);
  z = (z ^ z >> 30) * UINT64_C(0xbf58476d1ce4e5b9);
  z = (z ^ z >> 27) * UINT64_C(0x94d049bb133111eb);
  return z ^ z >> 31;
}

/* At full depth: the published inverse gives the cell back, and the next key the next cell. */
START_TEST(deep_keys_invert) {
  uint64_t state = 11;
  for (int trial = 0; trial < 20000; trial++) {
    const int dim = 2 + trial % 2, bits = bits_of(dim);
    const uint64_t key = draw(&state) % ((UINT64_C(1) << dim * bits) - 1);
    uint32_t cell[3], next[3];
    double place[4];
    decode(dim, key, cell);
    decode(dim, key + 1, next);
    centre(domain_of(dim), bits, cell, place);
    ck_assert_uint_eq(key_of(domain_of(dim), place), key);
    long distance = 0;
    for (int a = 0; a < dim; a++) distance += labs((long)cell[a] - (long)next[a]);
    ck_assert_int_eq(distance, 1);
  }
}
END_TEST

START_TEST(coarse_keys_are_the_top_bits_of_fine_ones) {
  uint64_t state = 5;
  for (int trial = 0; trial < 2000; trial++) {
    const int dim = 2 + trial % 2, bits = bits_of(dim);
    uint32_t cell[3], coarse[3];
    double place[4], coarse_place[4];
    for (int a = 0; a < 3; a++) cell[a] = (uint32_t)(draw(&state) >> (64 - bits));
    centre(domain_of(dim), bits, cell, place);
    const uint64_t key = key_of(domain_of(dim), place);
    for (int level = 0; level < bits; level++) {
      for (int a = 0; a < 3; a++) coarse[a] = cell[a] >> (bits - level);
      centre(domain_of(dim), level, coarse, coarse_place);
      const int shift = dim * (bits - level) - 1; /* -1: a shift by the width is undefined */
      ck_assert_uint_eq(key_of(domain_of(dim), coarse_place) >> shift >> 1, key >> shift >> 1);
    }
  }
}
END_TEST

START_TEST(outside_counts_as_the_border) {
  for (int dim = 2; dim <= 3; dim++) {
    const wend_domain *d = domain_of(dim);
    const uint32_t last = (UINT32_C(1) << bits_of(dim)) - 1;
    for (int a = 0; a < dim; a++) {
      uint32_t cell[3] = {12345, 67890, 13579};
      double border[4], place[4];
      cell[a] = 0;
      centre(d, bits_of(dim), cell, border);
      centre(d, bits_of(dim), cell, place);
      const double below[4] = {d->lo[a], d->lo[a] - 1.0, -HUGE_VAL, (double)NAN};
      for (int k = 0; k < 4; k++) {
        place[a] = below[k];
        ck_assert_uint_eq(key_of(d, place), key_of(d, border));
      }
      cell[a] = last;
      centre(d, bits_of(dim), cell, border);
      const double above[4] = {d->hi[a], d->hi[a] + 1.0, 1e300, HUGE_VAL};
      for (int k = 0; k < 4; k++) {
        place[a] = above[k];
        ck_assert_uint_eq(key_of(d, place), key_of(d, border));
      }
    }
  }
}
END_TEST

/* Ends of the curve, and the bounds that the interface promises. */
START_TEST(keys_span_their_range) {
  for (int dim = 2; dim <= 3; dim++) {
    const wend_domain *d = domain_of(dim);
    const uint64_t most = (UINT64_C(1) << dim * bits_of(dim)) - 1;
    const double first[4] = {d->lo[0], d->lo[1], d->lo[2], 0};
    const double end[4] = {d->hi[0], d->lo[1], d->lo[2], 0};
    ck_assert_uint_eq(key_of(d, first), 0);
    ck_assert_uint_eq(key_of(d, end), most);
  }
}
END_TEST

START_TEST(batches_do_not_change_keys) {
  enum { N = 200 };
  double place[N][4];
  uint64_t key[N], state = 2;
  for (int i = 0; i < N; i++)
    for (int a = 0; a < 4; a++) place[i][a] = ldexp((double)(draw(&state) >> 11), -49) - 4.0;
  for (int dim = 2; dim <= 3; dim++) {
    wend_hilbert_keys(domain_of(dim), 0, (const double(*)[4])place, key); /* nothing to do */
    wend_hilbert_keys(domain_of(dim), N, (const double(*)[4])place, key);
    for (int i = 0; i < N; i++) ck_assert_uint_eq(key[i], key_of(domain_of(dim), place[i]));
  }
}
END_TEST

/* A domain without width on an axis is not a division by zero. */
START_TEST(flat_domains_have_keys) {
  wend_domain flat = cube;
  flat.hi[2] = flat.lo[2];
  const double in[4] = {1, 6, 0, 0}, out[4] = {1, 6, 7, 0};
  ck_assert_uint_eq(key_of(&flat, in), key_of(&flat, out));
}
END_TEST

int main(void) {
  Suite *suite = suite_create("hilbert");
  TCase *tc = tcase_create("keys");
  tcase_add_test(tc, full_grids_are_walked_cell_by_cell);
  tcase_add_test(tc, deep_keys_invert);
  tcase_add_test(tc, coarse_keys_are_the_top_bits_of_fine_ones);
  tcase_add_test(tc, outside_counts_as_the_border);
  tcase_add_test(tc, keys_span_their_range);
  tcase_add_test(tc, batches_do_not_change_keys);
  tcase_add_test(tc, flat_domains_have_keys);
  suite_add_tcase(suite, tc);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  return failed != 0;
}
