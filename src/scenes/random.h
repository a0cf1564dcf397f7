/* SPDX-License-Identifier: GPL-3.0-or-later
 * random.h: random numbers that depend on a seed, an item and a channel only, not on ranks or
 * order (the finaliser of SplitMix64: Steele, Lea & Flood 2014). */
#ifndef WEND_SCENES_RANDOM_H
#define WEND_SCENES_RANDOM_H

#include <stdint.h>

static inline uint64_t wend_random_mix(uint64_t z) {
  z += UINT64_C(0x9e3779b97f4a7c15);
  z = (z ^ z >> 30) * UINT64_C(0xbf58476d1ce4e5b9);
  z = (z ^ z >> 27) * UINT64_C(0x94d049bb133111eb);
  return z ^ z >> 31;
}

/** Uniform in [0, 1): 53 bits. */
static inline double wend_random(uint64_t seed, uint64_t item, uint64_t channel) {
  const uint64_t bits =
      wend_random_mix(wend_random_mix(wend_random_mix(seed) ^ item) ^ channel << 32);
  return (double)(bits >> 11) * 0x1p-53;
}

#endif
