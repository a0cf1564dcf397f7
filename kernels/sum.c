/* SPDX-License-Identifier: LGPL-3.0-or-later
 * sum.c: the exact accumulator.
 *
 * The sum is sum_k limb[k] 2^(32 k - 1074), k < DIGITS. Canonical: digits in [0, 2^32), the
 * last one signed (two's complement over the whole number), so that equal sums have equal
 * limbs. A double is m 2^(t - 1074) with m < 2^53 and shift t: its low digit (32 bits) goes
 * into limb t/32, the rest (at most 52 bits) into the two limbs above; carries wait until a
 * limb could overflow. */
#include "sum.h"

#include <math.h>
#include <string.h>

#define DIGITS (WEND_SUM_LIMBS - 1)
#define FLAG (WEND_SUM_LIMBS - 1)
#define DIGIT_BITS 32
#define DIGIT_MASK INT64_C(0xffffffff)
#define MANTISSA_BITS 52
#define EXPONENT_MASK 0x7ff
#define LEAST_EXPONENT (-1074)
/* Terms between carries: each adds less than 2^32 to a limb that starts below 2^32. */
#define TERMS_PER_CARRY (INT64_C(1) << 30)

void wend_sum_reset(wend_sum *sum) { memset(sum, 0, sizeof *sum); }

void wend_sum_normalise(wend_sum *sum) {
  int64_t carry = 0;
  for (int k = 0; k < DIGITS - 1; k++) {
    const int64_t digit = sum->limb[k] + carry;
    sum->limb[k] = digit & DIGIT_MASK;
    carry = digit >> DIGIT_BITS; /* keeps the sign: both gcc and clang document it */
  }
  sum->limb[DIGITS - 1] += carry;
}

static inline void add_one(int64_t *limb, double term) {
  uint64_t bits;
  memcpy(&bits, &term, sizeof bits);
  const uint64_t exponent = bits >> MANTISSA_BITS & EXPONENT_MASK;
  if (exponent == EXPONENT_MASK) {
    limb[FLAG]++;
    return;
  }
  const uint64_t normal = exponent != 0;
  const uint64_t fraction = bits & ((UINT64_C(1) << MANTISSA_BITS) - 1);
  const uint64_t mantissa = fraction | normal << MANTISSA_BITS;
  const uint64_t shift = exponent - normal;
  const uint64_t offset = shift % DIGIT_BITS;
  const uint64_t rest = mantissa >> (DIGIT_BITS - offset);
  const int64_t sign = -(int64_t)(bits >> 63);
  int64_t *at = limb + shift / DIGIT_BITS;
  /* (x ^ sign) - sign negates x where sign = -1, without a branch on data. */
  at[0] += ((int64_t)(mantissa << offset & DIGIT_MASK) ^ sign) - sign;
  at[1] += ((int64_t)(rest & DIGIT_MASK) ^ sign) - sign;
  at[2] += ((int64_t)(rest >> DIGIT_BITS) ^ sign) - sign;
}

void wend_sum_add(wend_sum *sum, int64_t n, const double *term, int64_t stride) {
  for (int64_t begin = 0; begin < n; begin += TERMS_PER_CARRY) {
    const int64_t end = n - begin < TERMS_PER_CARRY ? n : begin + TERMS_PER_CARRY;
    for (int64_t i = begin; i < end; i++) add_one(sum->limb, term[i * stride]);
    wend_sum_normalise(sum);
  }
}

void wend_sum_merge(wend_sum *sum, const wend_sum *other) {
  for (int k = 0; k < WEND_SUM_LIMBS; k++) sum->limb[k] += other->limb[k];
  wend_sum_normalise(sum);
}

/* Rounds a positive canonical number: the top 64 bits, with everything below joined into the
 * last of them, convert to double with one correct rounding. The scale is exact: no digit lies
 * below 2^-1074, so a subnormal result had nothing to round. Beyond the largest double ldexp
 * gives infinity. */
static double round_positive(const int64_t *limb, int top) {
  const uint64_t next = top > 0 ? (uint64_t)limb[top - 1] : 0;
  const uint64_t third = top > 1 ? (uint64_t)limb[top - 2] : 0;
  int lead = 0;
  while ((uint64_t)limb[top] << lead >> (DIGIT_BITS - 1) == 0) lead++;
  const uint64_t high = ((uint64_t)limb[top] << DIGIT_BITS | next) << lead;
  const uint64_t low = third << lead;
  uint64_t sticky = low & (uint64_t)DIGIT_MASK;
  for (int k = 0; k < top - 2; k++) sticky |= (uint64_t)limb[k];
  const uint64_t window = high | low >> DIGIT_BITS | (sticky != 0);
  return ldexp((double)window, DIGIT_BITS * (top - 1) - lead + LEAST_EXPONENT);
}

double wend_sum_value(const wend_sum *sum) {
  if (sum->limb[FLAG] != 0) return (double)NAN;
  wend_sum size = *sum;
  wend_sum_normalise(&size);
  const int negative = size.limb[DIGITS - 1] < 0;
  if (negative) {
    for (int k = 0; k < DIGITS; k++) size.limb[k] = -size.limb[k];
    wend_sum_normalise(&size);
  }
  int top = DIGITS - 1;
  while (top >= 0 && size.limb[top] == 0) top--;
  if (top < 0) return 0.0;
  const double value = round_positive(size.limb, top);
  return negative ? -value : value;
}
