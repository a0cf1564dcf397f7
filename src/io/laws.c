/* SPDX-License-Identifier: LGPL-3.0-or-later
 * laws.c: fills columns of coefficients from the laws of a setup. */
#include "laws.h"
#include "records.h"
#include <inttypes.h>
#include <math.h>
#include <stdlib.h>

/* A coefficient: its key in the setup, its column, its law. */
typedef struct law_row {
  const char *key;
  wend_column column;
  size_t law;
} law_row;

static const law_row rows[] = {
    {"diffusion.parallel", WEND_KPAR, offsetof(wend_setup, kappa_par)},
    {"diffusion.perpendicular", WEND_KPERP, offsetof(wend_setup, kappa_perp)},
};
enum { ROWS = sizeof rows / sizeof rows[0] };

static const wend_law *law_of(const wend_setup *setup, const law_row *row) {
  return (const wend_law *)((const char *)setup + row->law);
}

static void ask_for(wend_team *team, const wend_setup *setup, const law_row *row,
                    const wend_particles *particles, wend_column column) {
  if (particles->column[column] == NULL)
    wend_fail(team, WEND_ERR_FILE, "%s: %s needs the record %s, which %s lacks", setup->path,
              row->key, wend_record_of(column)->name, setup->particles);
}

static double strength(const wend_particles *p, int32_t i) {
  const double x = p->column[WEND_BX][i], y = p->column[WEND_BY][i];
  const double z = p->column[WEND_BZ] != NULL ? p->column[WEND_BZ][i] : 0;
  const double most = fmax(fmax(fabs(x), fabs(y)), fabs(z));
  if (!(most > 0)) return 0;
  return most *
         sqrt((x / most) * (x / most) + (y / most) * (y / most) + (z / most) * (z / most));
}

/* value (rho / density)^density_index (|B| / field)^field_index */
static void fill_power(wend_team *team, const wend_setup *setup, const law_row *row,
                       wend_particles *p) {
  const wend_law *law = law_of(setup, row);
  double *k = p->column[row->column];
  if (law->density_index != 0) ask_for(team, setup, row, p, WEND_DENSITY);
  if (law->field_index != 0) ask_for(team, setup, row, p, WEND_BX);
  for (int32_t i = 0; i < p->n && team->status == WEND_OK; i++) {
    k[i] = law->value;
    if (law->density_index != 0)
      k[i] *= pow(p->column[WEND_DENSITY][i] / law->density, law->density_index);
    if (law->field_index != 0) k[i] *= pow(strength(p, i) / law->field, law->field_index);
    if (!isfinite(k[i]))
      wend_fail(team, WEND_ERR_PARTICLES,
                "%s: %s is %g at particle id %" PRIu64
                ": the power law leaves the range of numbers there",
                setup->path, row->key, k[i], p->id[i]);
  }
}

static void fill(wend_team *team, const wend_setup *setup, const law_row *row,
                 wend_particles *p) {
  const wend_law *law = law_of(setup, row);
  if (law->kind == WEND_LAW_RECORD) {
    ask_for(team, setup, row, p, row->column);
    return;
  }
  if (wend_particles_add(team, p, row->column) != WEND_OK) return;
  if (law->kind == WEND_LAW_POWER) {
    fill_power(team, setup, row, p);
    return;
  }
  for (int32_t i = 0; i < p->n; i++) p->column[row->column][i] = law->value;
}

wend_status wend_laws_apply(wend_team *team, const wend_setup *setup,
                            wend_particles *particles) {
  for (int k = 0; k < ROWS; k++) fill(team, setup, &rows[k], particles);
  return wend_agree(team);
}

void wend_laws_drop_constant(const wend_setup *setup, wend_particles *particles) {
  for (int k = 0; k < ROWS; k++) {
    if (law_of(setup, &rows[k])->kind != WEND_LAW_CONSTANT) continue;
    free(particles->column[rows[k].column]);
    particles->column[rows[k].column] = NULL;
  }
}
