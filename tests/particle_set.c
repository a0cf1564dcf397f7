/* SPDX-License-Identifier: GPL-3.0-or-later
 * particle_set.c: a set of particles with all columns, its file, and ways to spoil the file. */
#include "particle_set.h"
#include "box.h"
#include "scratch.h"
#include "spread.h"
#include <math.h>
#include <string.h>

const wend_units set_units = {3e19, 3e13, 2e30};

static const double low[3] = {0, -1, 2}, high[3] = {1, 1, 5};

wend_domain set_box(int dim) {
  static const wend_boundary edge[3] = {WEND_BOUNDARY_PERIODIC, WEND_BOUNDARY_CLOSED,
                                        WEND_BOUNDARY_OPEN};
  return wend_box_make(dim, low, high, edge, 0.25);
}

/* A number in (0, 1) that fills its digits, and differs from column to column. */
double set_value(int dim, int64_t i, int c) {
  const double share = fmod(0.5 + (double)(i + 1) * 0.6180339887498949 * (c + 1), 1.0);
  if (c <= WEND_Z) return c < dim ? low[c] + (high[c] - low[c]) * share : 0;
  return c == WEND_BX && i == 3 ? -0.0 : share * 0.9 + 0.05;
}

uint64_t set_id(int64_t i) { return UINT64_MAX - (uint64_t)i * 1000003; }

/* This rank's part of the whole set; the second rank has none of it. */
wend_particles set_make(wend_team *t, int dim, uint64_t mask) {
  const int takers = t->size > 1 ? t->size - 1 : 1, place = t->rank > 1 ? t->rank - 1 : t->rank;
  const bool takes = t->rank != 1;
  const int64_t first = SET_ROWS * place / takers,
                end = takes ? SET_ROWS * (place + 1) / takers : first;
  wend_particles p;
  wend_particles_init(t, &p, (int32_t)(end - first), mask);
  for (int32_t i = 0; i < p.n; i++) {
    p.id[i] = set_id(first + i);
    for (int c = 0; c < WEND_COLUMNS; c++)
      if (p.column[c] != NULL) p.column[c][i] = set_value(dim, first + i, c);
  }
  return p;
}

wend_file_facts set_facts(int dim) {
  return (wend_file_facts){.iteration = 40,
                           .time = 0.1,
                           .dt = 1 / 3.0,
                           .domain_given = true,
                           .domain = set_box(dim),
                           .setup = "particles: a\n"};
}

wend_status set_write(wend_team *team, const char *name, int dim, uint64_t mask) {
  wend_particles p = set_make(team, dim, mask);
  const wend_file_facts facts = set_facts(dim);
  const wend_status status =
      wend_particle_file_write(team, scratch_path(name), &set_units, &p, &facts);
  wend_particles_reset(&p);
  return status;
}

wend_status set_read(wend_team *team, const char *name, uint64_t needed, wend_particles *p,
                     wend_file_facts *facts, bool *density) {
  return wend_particle_file_read(team, scratch_path(name), &set_units, needed, p, facts,
                                 density);
}

/* Rows of a rank that reads: equal blocks. */
int64_t set_first_row(const wend_team *team) {
  const int64_t rest = SET_ROWS % team->size;
  return team->rank * (SET_ROWS / team->size) + (team->rank < rest ? team->rank : rest);
}

bool set_is_same(wend_team *team, const wend_particles *p, int dim, uint64_t mask) {
  bool same = wend_particles_mask(p) == mask;
  for (int32_t i = 0; i < p->n; i++) {
    same = same && p->id[i] == set_id(set_first_row(team) + i);
    for (int c = 0; c < WEND_COLUMNS; c++) {
      const double expected = set_value(dim, set_first_row(team) + i, c);
      if (p->column[c] == NULL) continue;
      same = same && memcmp(&p->column[c][i], &expected, sizeof expected) == 0;
    }
  }
  int64_t n = p->n;
  wend_team_count(team, 1, &n);
  return spread_everywhere(same && n == SET_ROWS);
}

void tamper_text(hid_t file, const char *object, const char *name, const char *text) {
  const hid_t type = H5Tcopy(H5T_C_S1), space = H5Screate(H5S_SCALAR);
  H5Tset_size(type, strlen(text));
  H5Adelete_by_name(file, object, name, H5P_DEFAULT);
  const hid_t a =
      H5Acreate_by_name(file, object, name, type, space, H5P_DEFAULT, H5P_DEFAULT, H5P_DEFAULT);
  H5Awrite(a, type, text);
  H5Aclose(a);
  H5Sclose(space);
  H5Tclose(type);
}

void tamper_numbers(hid_t file, const char *object, const char *name, hsize_t n,
                    const double *x) {
  const hid_t space = H5Screate_simple(1, &n, NULL);
  H5Adelete_by_name(file, object, name, H5P_DEFAULT);
  const hid_t a = H5Acreate_by_name(file, object, name, H5T_NATIVE_DOUBLE, space, H5P_DEFAULT,
                                    H5P_DEFAULT, H5P_DEFAULT);
  H5Awrite(a, H5T_NATIVE_DOUBLE, x);
  H5Aclose(a);
  H5Sclose(space);
}

/* Rank 0 edits the file on its own. Collective. */
void set_tamper(const char *name, void (*edit)(hid_t file)) {
  int rank;
  MPI_Comm_rank(MPI_COMM_WORLD, &rank);
  MPI_Barrier(MPI_COMM_WORLD);
  if (rank == 0) {
    const hid_t file = H5Fopen(scratch_path(name), H5F_ACC_RDWR, H5P_DEFAULT);
    H5E_BEGIN_TRY { edit(file); }
    H5E_END_TRY
    H5Fclose(file);
  }
  MPI_Barrier(MPI_COMM_WORLD);
}
