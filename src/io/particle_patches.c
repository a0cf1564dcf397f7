/* SPDX-License-Identifier: LGPL-3.0-or-later
 * particle_patches.c: tells readers of a particle file which stretch of particles lies in which
 * box.
 *
 * Particles in canonical order pass through the 64 coarsest cells of the Hilbert curve one
 * after the other (4^3 in 3-D, 8^2 in 2-D), so those that share a cell are one stretch; its
 * patch is the box around them. Neither depends on the number of ranks. Particles in another
 * order make a single patch. */
#include "particle_writer.h"
#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { CELLS = 64, KEY_BITS_2D = 62, KEY_BITS_3D = 63, CELL_BITS = 6 };

typedef struct patches {
  int64_t count[CELLS];
  double lo[3][CELLS], hi[3][CELLS]; /* -INFINITY in hi: no particle */
} patches;

static int cell_of(const wend_particle_writer *w, int32_t i) {
  return (int)(w->particles->key[i] >> ((w->dim == 2 ? KEY_BITS_2D : KEY_BITS_3D) - CELL_BITS));
}

/* Are cells ascending on this rank, and within range? Its first and last are reported. */
static bool ascending(const wend_particle_writer *w, int64_t *first, int64_t *last) {
  const int32_t n = w->particles->n;
  for (int32_t i = 0; i < n; i++)
    if (cell_of(w, i) >= CELLS || (i > 0 && cell_of(w, i) < cell_of(w, i - 1))) return false;
  *first = n > 0 ? cell_of(w, 0) : -1;
  *last = n > 0 ? cell_of(w, n - 1) : -1;
  return true;
}

/* The same over all ranks: the last cell of any rank before must not exceed the first of this
 * one. */
static bool in_order(wend_particle_writer *w) {
  int64_t first = -1, last = -1, before = -1;
  bool good = ascending(w, &first, &last);
  if (MPI_Exscan(&last, &before, 1, MPI_INT64_T, MPI_MAX, w->team->comm) != MPI_SUCCESS)
    wend_fail(w->team, WEND_ERR_MPI, "ranks could not compare their particles");
  if (w->team->rank > 0 && first >= 0 && before > first) good = false;
  int64_t bad = !good;
  wend_team_count(w->team, 1, &bad);
  return bad == 0;
}

static void measure(wend_particle_writer *w, bool ordered, patches *p) {
  for (int c = 0; c < CELLS; c++)
    for (int a = 0; a < 3; a++) {
      p->lo[a][c] = INFINITY;
      p->hi[a][c] = -INFINITY;
    }
  for (int32_t i = 0; i < w->particles->n; i++) {
    const int c = ordered ? cell_of(w, i) : 0;
    p->count[c]++;
    for (int a = 0; a < w->dim; a++) {
      const double x = w->particles->column[WEND_X + a][i];
      p->lo[a][c] = fmin(p->lo[a][c], x);
      p->hi[a][c] = fmax(p->hi[a][c], x);
    }
  }
  wend_team_count(w->team, CELLS, p->count);
  for (int a = 0; a < w->dim; a++) {
    wend_team_min(w->team, CELLS, p->lo[a]);
    wend_team_max(w->team, CELLS, p->hi[a]);
  }
}

/* Writes one number a patch. Rank 0 holds the block. */
static wend_status put_list(wend_particle_writer *w, hid_t parent, const char *name, hid_t type,
                            int n, const void *value, wend_quantity quantity, bool scalar) {
  const wend_hdf_block block = wend_hdf_share(w->team, type, w->team->rank == 0 ? n : 0);
  hid_t set = -1;
  const wend_status status = wend_hdf_write(&w->hdf, parent, name, &block, value, &set);
  if (set < 0) return status;
  wend_particle_put_unit(w, set, quantity);
  if (scalar) wend_particle_put_record_facts(w, set, quantity);
  H5Dclose(set);
  return status;
}

static wend_status put_vector(wend_particle_writer *w, hid_t parent, const char *name, int n,
                              double (*value)[CELLS]) {
  static const char *const axis_name[3] = {"x", "y", "z"};
  wend_status status = WEND_OK;
  const hid_t group = wend_hdf_group(&w->hdf, parent, name);
  wend_particle_put_record_facts(w, group, WEND_Q_LENGTH);
  for (int a = 0; a < w->dim; a++)
    WEND_TRY(
        put_list(w, group, axis_name[a], H5T_NATIVE_DOUBLE, n, value[a], WEND_Q_LENGTH, false));
done:
  if (group >= 0) H5Gclose(group);
  return status;
}

/* Keeps the cells that hold particles, and turns corners into offset and extent: the lower
 * bound belongs to the patch and the upper does not, so the extent reaches just beyond the last
 * particle. */
static int compress(wend_particle_writer *w, patches *p, uint64_t *number, uint64_t *first) {
  int n = 0;
  uint64_t before = 0;
  for (int c = 0; c < CELLS; c++) {
    if (p->count[c] == 0) continue;
    for (int a = 0; a < w->dim; a++) {
      double extent = nextafter(p->hi[a][c], INFINITY) - p->lo[a][c];
      while (p->lo[a][c] + extent <= p->hi[a][c]) extent = nextafter(extent, INFINITY);
      p->lo[a][n] = p->lo[a][c];
      p->hi[a][n] = extent;
    }
    number[n] = (uint64_t)p->count[c];
    first[n] = before;
    before += number[n++];
  }
  return n;
}

wend_status wend_particle_put_patches(wend_particle_writer *w) {
  wend_status status;
  hid_t group = -1;
  uint64_t number[CELLS], first[CELLS];
  patches *p = wend_allocate(w->team, 1, sizeof *p);
  WEND_TRY(wend_agree(w->team));
  measure(w, in_order(w), p);
  const int n = compress(w, p, number, first);
  if (n == 0) goto done;
  group = wend_hdf_group(&w->hdf, w->gas, "particlePatches");
  WEND_TRY(
      put_list(w, group, "numParticles", H5T_NATIVE_UINT64, n, number, WEND_Q_NUMBER, true));
  WEND_TRY(put_list(w, group, "numParticlesOffset", H5T_NATIVE_UINT64, n, first, WEND_Q_NUMBER,
                    true));
  WEND_TRY(put_vector(w, group, "offset", n, p->lo));
  WEND_TRY(put_vector(w, group, "extent", n, p->hi));
done:
  if (group >= 0) H5Gclose(group);
  free(p);
  return status;
}
