/* SPDX-License-Identifier: LGPL-3.0-or-later
 * clones.h: variants of a function for wider vectors, chosen when the program starts.
 *
 * The default build is for any processor of the architecture. A function marked WEND_CLONES is
 * compiled for wider vectors as well, where compiler and C library can choose at run time. No
 * variant fuses multiplication and addition, and no sum is reordered: all give the same bits.
 * Only for static functions: clang 14 gives a public one no symbol of its own name; and helpers
 * that are not inlined need the mark themselves. */
#ifndef WEND_KERNELS_CLONES_H
#define WEND_KERNELS_CLONES_H

#include <limits.h> /* lets the C library say who it is */

#if defined(__x86_64__) && defined(__GLIBC__) && !defined(__AVX2__) &&                         \
    !defined(WEND_PORTABLE) && (defined(__clang__) ? __clang_major__ >= 14 : __GNUC__ >= 9)
#define WEND_CLONES __attribute__((target_clones("default", "avx2")))
#else
#define WEND_CLONES
#endif

#endif
