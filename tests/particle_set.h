/* SPDX-License-Identifier: GPL-3.0-or-later
 * particle_set.h: a set of particles with all columns, its file, and ways to spoil the file. */
#ifndef WEND_TESTS_PARTICLE_SET_H
#define WEND_TESTS_PARTICLE_SET_H

#include "particle_file.h"
#include <hdf5.h>

enum { SET_ROWS = 101 };
#define SET_ALL (((uint64_t)1 << WEND_COLUMNS) - 1)
#define SET_GAS "/data/40/particles/gas/"

extern const wend_units set_units;

/** A box: periodic [0, 1), closed [-1, 1], and in 3-D open [2, 5]. */
wend_domain set_box(int dim);
/** Value of column c in row i: a number in (0, 1) that fills its digits, places in the box, one
 * -0. */
double set_value(int dim, int64_t i, int c);
uint64_t set_id(int64_t i);
/** This rank's part of the set; the second rank has none. */
wend_particles set_make(wend_team *team, int dim, uint64_t mask);
/** Iteration 40 and the box. */
wend_file_facts set_facts(int dim);

/** Writes the set to a file of scratch.h. Collective. */
wend_status set_write(wend_team *team, const char *name, int dim, uint64_t mask);
wend_status set_read(wend_team *team, const char *name, uint64_t needed, wend_particles *p,
                     wend_file_facts *facts, bool *density);
/** First row of this rank where blocks are equal, as after reading. */
int64_t set_first_row(const wend_team *team);
/** Is the set that was read the one that was made, to the bit, with these columns? Collective.
 */
bool set_is_same(wend_team *team, const wend_particles *p, int dim, uint64_t mask);

/** Lets rank 0 edit a file on its own. Collective. */
void set_tamper(const char *name, void (*edit)(hid_t file));
/** Replaces an attribute. Local. */
void tamper_text(hid_t file, const char *object, const char *name, const char *text);
void tamper_numbers(hid_t file, const char *object, const char *name, hsize_t n,
                    const double *x);

#endif
