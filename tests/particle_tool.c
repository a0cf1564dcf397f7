/* SPDX-License-Identifier: GPL-3.0-or-later
 * particle_tool.c: writes and prints particle files for the tests in Python.
 *
 *     particle_tool write FILE DIM N ITERATION [bare]   N particles in canonical order; bare:
 * no box, no setup, positions and energies alone particle_tool read FILE ITERATION prints what
 * was read, in SI, exact (%a) */
#include "box.h"
#include "hilbert.h"
#include "particle_file.h"

#include <inttypes.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static wend_team team;

typedef struct row {
  uint64_t key, id;
  double place[4];
} row;

static int by_key(const void *a, const void *b) {
  const row *x = a, *y = b;
  return x->key != y->key ? (x->key > y->key) - (x->key < y->key)
                          : (x->id > y->id) - (x->id < y->id);
}

/* A set that fills the box by the square roots of primes, sorted along the Hilbert curve; the
 * same on all ranks. */
static row *make_rows(const wend_domain *domain, int n) {
  static const double prime[3] = {2, 3, 5};
  row *rows = calloc((size_t)n + 1, sizeof *rows);
  for (int i = 0; i < n; i++) {
    rows[i].id = (uint64_t)i * 12345678901u;
    for (int a = 0; a < domain->dim; a++)
      rows[i].place[a] = domain->lo[a] + (domain->hi[a] - domain->lo[a]) *
                                             fmod(0.5 + (i + 1) * sqrt(prime[a]), 1.0);
    wend_hilbert_keys(domain, 1, &rows[i].place, &rows[i].key);
  }
  qsort(rows, (size_t)n, sizeof *rows, by_key);
  return rows;
}

static wend_particles own_rows(const row *rows, int n, int dim, uint64_t mask) {
  const int first = n * team.rank / team.size, end = n * (team.rank + 1) / team.size;
  wend_particles p;
  wend_particles_init(&team, &p, end - first, mask);
  for (int32_t i = 0; i < p.n; i++) {
    const row *r = &rows[first + i];
    p.id[i] = r->id;
    p.key[i] = r->key;
    for (int c = 0; c < WEND_COLUMNS; c++) {
      if (p.column[c] == NULL) continue;
      p.column[c][i] = c <= WEND_Z ? r->place[c] : (double)(1 + r->id % 97) / (c + 100);
      if (dim == 2 && (c == WEND_BZ || c == WEND_VZ)) p.column[c][i] = 0;
    }
  }
  return p;
}

static wend_status write_file(const char *path, int dim, int n, int64_t iteration, bool bare) {
  static const double low[3] = {-1, 0, 3}, high[3] = {1, 1, 4};
  static const wend_boundary edge[3] = {WEND_BOUNDARY_PERIODIC, WEND_BOUNDARY_OPEN,
                                        WEND_BOUNDARY_CLOSED};
  const wend_units units = wend_units_default();
  const wend_file_facts facts = {.iteration = iteration,
                                 .time = 2.5,
                                 .dt = 0.25,
                                 .domain_given = !bare,
                                 .domain = wend_box_make(dim, low, high, edge, 0.5),
                                 .setup = bare ? NULL : "# text of a setup\nparticles: a\n"};
  row *rows = make_rows(&facts.domain, n);
  const uint64_t few = 7 << WEND_X | 1 << WEND_ENERGY;
  wend_particles p = own_rows(rows, n, dim, bare ? few : ((uint64_t)1 << WEND_COLUMNS) - 1);
  const wend_status status = wend_particle_file_write(&team, path, &units, &p, &facts);
  wend_particles_reset(&p);
  free(rows);
  return status;
}

static const char *const names[WEND_COLUMNS] = {
    "x",        "y",    "z",     "bx",      "by",        "bz",     "vx",
    "vy",       "vz",   "mass",  "density", "support",   "volume", "energy",
    "internal", "kpar", "kperp", "ionised", "electrons", "source"};

/* The particles of this rank as text, to be freed. */
static char *rows_text(const wend_particles *p, int *length) {
  char *text = NULL;
  size_t size = 0;
  FILE *out = open_memstream(&text, &size);
  for (int32_t i = 0; i < p->n; i++) {
    fprintf(out, "%" PRIu64, p->id[i]);
    for (int c = 0; c < WEND_COLUMNS; c++)
      if (p->column[c] != NULL) fprintf(out, " %s=%a", names[c], p->column[c][i]);
    fprintf(out, "\n");
  }
  fclose(out);
  *length = (int)size;
  return text;
}

/* Rank 0 prints for all: a launcher mixes what several ranks print, whatever their order. */
static void print_rows(const wend_particles *p) {
  enum { TAG = 1 };
  int length;
  char *text = rows_text(p, &length);
  if (team.rank > 0) MPI_Send(text, length, MPI_CHAR, 0, TAG, MPI_COMM_WORLD);
  for (int r = 0; r < team.size && team.rank == 0; r++) {
    if (r > 0) {
      MPI_Status sent;
      MPI_Probe(r, TAG, MPI_COMM_WORLD, &sent);
      MPI_Get_count(&sent, MPI_CHAR, &length);
      text = realloc(text, (size_t)length + 1);
      MPI_Recv(text, length, MPI_CHAR, r, TAG, MPI_COMM_WORLD, MPI_STATUS_IGNORE);
    }
    fwrite(text, 1, (size_t)length, stdout);
  }
  free(text);
}

static wend_status read_file(const char *path, int64_t iteration) {
  const wend_units si = {1, 1, 1};
  wend_particles p;
  wend_file_facts facts;
  bool density = false;
  const wend_status status =
      wend_particle_file_read_at(&team, path, iteration, &si, 0, &p, &facts, &density);
  if (status != WEND_OK) return status;
  if (team.rank == 0) {
    printf("iteration=%" PRId64 " time=%a dt=%a dim=%d density=%d domain=%d", facts.iteration,
           facts.time, facts.dt, facts.domain.dim, density, facts.domain_given);
    for (int a = 0; a < facts.domain.dim && facts.domain_given; a++)
      printf(" %a %a %s", facts.domain.lo[a], facts.domain.hi[a],
             wend_boundary_name(wend_box_boundary(&facts.domain, a)));
    printf("\n");
  }
  print_rows(&p);
  wend_particles_reset(&p);
  return status;
}

int main(int count, char **word) {
  MPI_Init(&count, &word);
  wend_team_init(&team, MPI_COMM_WORLD);
  wend_status status = WEND_ERR_ARGUMENT;
  if (count >= 6 && strcmp(word[1], "write") == 0)
    status = write_file(word[2], atoi(word[3]), atoi(word[4]), strtoll(word[5], NULL, 10),
                        count > 6);
  else if (count == 4 && strcmp(word[1], "read") == 0)
    status = read_file(word[2], strtoll(word[3], NULL, 10));
  if (status != WEND_OK && team.rank == 0) printf("error: %s\n", team.text);
  wend_team_reset(&team);
  MPI_Finalize();
  return 0;
}
