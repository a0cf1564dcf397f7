/* SPDX-License-Identifier: GPL-3.0-or-later
 * arch.c: an invented example: cosmic rays let loose at the foot of a magnetic arch.
 *
 * A box of 2 kpc, periodic in x and y, open at top and bottom, holds a gas layer with density
 * rho_0 / cosh^2(z/h). The field is a potential arcade on either side of the mid-plane with a
 * guide field along y,
 *
 *   B = B_0 [ cos(k x) exp(-k|z|),  1/2,  -sign(z) sin(k x) exp(-k|z|) ],   k = 2 pi / 2 kpc.
 *
 * 1e50 erg of CRs start as a Gaussian at the foot of an arch. All numbers are invented for the
 * example. */
#include "arch.h"
#include "cut.h"
#include "lattice.h"
#include "particle_file.h"
#include <errno.h>
#include <math.h>
#include <stdio.h>
#include <string.h>
#include <sys/stat.h>

static const char setup_text[] =
    "# An invented example: cosmic rays let loose at the foot of a magnetic arch.\n"
    "particles: %s/arch.h5\n"
    "output:\n"
    "  folder: %s/out\n"
    "  name: arch\n"
    "  every: 2 Myr\n"
    "  checkpoint_every_steps: 50\n"
    "time:\n"
    "  end: 6 Myr\n"
    "diffusion:\n"
    "  parallel:\n"
    "    power: {at: 3e28 cm^2/s, field: 3 uG, field_index: -0.5}\n"
    "  perpendicular: 0 cm^2/s\n";

/* The numbers of the example, in run units. */
typedef struct arch {
  double density, height, field, k, energy, width, foot[3];
} arch;

static wend_status read_numbers(wend_team *team, const wend_units *units, arch *a) {
  static const wend_dimension length = {1}, energy = {2, 1, -2}, density = {-3, 1};
  static const wend_dimension field = {0, 1, -2, -1};
  wend_status status = WEND_OK;
  *a = (arch){.k = M_PI, .foot = {0.5, 0, 0}};
  WEND_TRY(wend_units_parse(team, units, density, "density", "2e-24 g/cm^3", &a->density));
  WEND_TRY(wend_units_parse(team, units, length, "height", "300 pc", &a->height));
  WEND_TRY(wend_units_parse(team, units, length, "width", "100 pc", &a->width));
  WEND_TRY(wend_units_parse(team, units, field, "field", "6 uG", &a->field));
  WEND_TRY(wend_units_parse(team, units, energy, "energy", "1e50 erg", &a->energy));
done:
  return status;
}

/* Columns of particle i; the volume is its cell's, which the Gaussian is normalised with. */
static void dress(const arch *a, double cell, double **column, int32_t i) {
  const double x = column[WEND_X][i], z = column[WEND_Z][i];
  const double fall = exp(-a->k * fabs(z)), layer = 1 / cosh(z / a->height);
  const double rho = a->density * layer * layer;
  column[WEND_BX][i] = a->field * cos(a->k * x) * fall;
  column[WEND_BY][i] = a->field / 2;
  column[WEND_BZ][i] = -copysign(a->field * sin(a->k * x) * fall, z);
  column[WEND_DENSITY][i] = rho;
  column[WEND_MASS][i] = rho * cell;
  double r2 = 0;
  for (int d = 0; d < 3; d++) {
    const double off = column[WEND_X + d][i] - a->foot[d];
    r2 += off * off;
  }
  const double s2 = a->width * a->width;
  column[WEND_ENERGY][i] = a->energy * cell * exp(-r2 / (2 * s2)) / pow(2 * M_PI * s2, 1.5);
}

static wend_status write_particles(wend_team *team, const char *path, int side) {
  const wend_units units = wend_units_default();
  const double lo[3] = {-1, -1, -1}, hi[3] = {1, 1, 1}, spacing = 2.0 / side;
  const wend_lattice lattice = {{side, side, side}, 0.3, 1};
  const uint64_t mask = UINT64_C(1) << WEND_BX | UINT64_C(1) << WEND_BY |
                        UINT64_C(1) << WEND_BZ | UINT64_C(1) << WEND_MASS |
                        UINT64_C(1) << WEND_DENSITY | UINT64_C(1) << WEND_ENERGY;
  wend_file_facts facts = {.domain_given = true, .domain = wend_scene_domain(3, lo, hi, true)};
  wend_particles particles = {0};
  arch a;
  wend_status status = read_numbers(team, &units, &a);
  if (status != WEND_OK) return wend_agree(team);
  facts.domain.period[2] = 0;
  facts.domain.half[2] = INFINITY;
  facts.domain.open[2] = true;
  WEND_TRY(wend_lattice_fill(team, &facts.domain, &lattice, mask, &particles));
  for (int32_t i = 0; i < particles.n; i++)
    dress(&a, spacing * spacing * spacing, particles.column, i);
  WEND_TRY(wend_cut_particles(team, &facts.domain, &particles, NULL));
  WEND_TRY(wend_particle_file_write(team, path, &units, &particles, &facts));
done:
  wend_particles_reset(&particles);
  return status;
}

static void write_setup(wend_team *team, const char *path, const char *folder) {
  FILE *file = fopen(path, "w");
  if (file == NULL) {
    wend_fail(team, WEND_ERR_FILE, "%s: %s", path, strerror(errno));
    return;
  }
  const bool written = fprintf(file, setup_text, folder, folder) > 0;
  if (fclose(file) != 0 || !written)
    wend_fail(team, WEND_ERR_FILE, "%s: could not be written", path);
}

wend_status wend_arch_write(wend_team *team, const char *folder, int side) {
  char path[512];
  if (team->rank == 0 && mkdir(folder, 0777) != 0 && errno != EEXIST)
    wend_fail(team, WEND_ERR_FILE, "%s: %s", folder, strerror(errno));
  if (snprintf(path, sizeof path, "%s/arch.yaml", folder) >= (int)sizeof path)
    wend_fail(team, WEND_ERR_ARGUMENT, "%s: the path is too long", folder);
  else if (team->rank == 0)
    write_setup(team, path, folder);
  const wend_status status = wend_agree(team);
  if (status != WEND_OK) return status;
  snprintf(path, sizeof path, "%s/arch.h5", folder);
  return write_particles(team, path, side);
}
