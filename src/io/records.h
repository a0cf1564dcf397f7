/* SPDX-License-Identifier: LGPL-3.0-or-later
 * records.h: which record of a particle file goes with which column. Private. */
#ifndef WEND_IO_RECORDS_H
#define WEND_IO_RECORDS_H

#include "particles.h"
#include "units.h"

typedef enum wend_range {
  WEND_RANGE_ANY,          /**< any finite value */
  WEND_RANGE_POSITIVE,     /**< > 0 */
  WEND_RANGE_NOT_NEGATIVE, /**< >= 0 */
  WEND_RANGE_SHARE         /**< in [0, 1] */
} wend_range;

/** A record: a row of the table. */
typedef struct wend_record {
  const char *name;
  wend_column column; /**< the first of its columns */
  int components;     /**< 1: scalar; 3: vector, x and y and z in columns side by side */
  wend_quantity quantity;
  wend_range range;
} wend_record;

/** The k-th record, in the order of the file; NULL beyond the last. Position comes first.
 * Local. */
const wend_record *wend_record_at(int k);
/** The record that holds a column. Local. */
const wend_record *wend_record_of(wend_column column);
/** The records beside cosmicRayEnergy that CR energy may be read from: a volume, a mass. Local.
 */
const wend_record *wend_record_energy_density(void);
const wend_record *wend_record_specific_energy(void);

/** Says what a value of this range must be: "greater than 0". Local. */
const char *wend_range_text(wend_range range);
/** Is the value finite and in range? Local. */
bool wend_range_holds(wend_range range, double value);

#endif
