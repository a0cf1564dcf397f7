/* SPDX-License-Identifier: LGPL-3.0-or-later
 * machine.h: what of a machine may change the bits of a result: processor and math library.
 * Private. */
#ifndef WEND_IO_MACHINE_H
#define WEND_IO_MACHINE_H

#include <stddef.h>
#include <stdint.h>

/** Name of the processor, as the system gives it. Local. */
void wend_machine_processor(size_t size, char *text);
/** Name and version of the math library. Local. */
void wend_machine_math(size_t size, char *text);
/** Hash of the bits of exp, log, tanh and pow at fixed places: libraries choose variants by
 *  processor, so the same version may round differently elsewhere. Local. */
uint64_t wend_machine_fingerprint(void);

/** A step of a hash: mixes all bits of x (finaliser of SplitMix64: Steele, Lea & Flood 2014).
 * Local. */
uint64_t wend_machine_mix(uint64_t x);

#endif
