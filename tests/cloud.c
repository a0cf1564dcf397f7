/* SPDX-License-Identifier: GPL-3.0-or-later
 * cloud.c: sets of particles that make neighbour search difficult. */
#include "cloud.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

double cloud_random(uint64_t *state) {
  uint64_t z = (*state += 0x9e3779b97f4a7c15u);
  z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9u;
  z = (z ^ (z >> 27)) * 0x94d049bb133111ebu;
  return (double)((z ^ (z >> 31)) >> 11) * 0x1p-53;
}

/* A support that holds about 40 neighbours of n uniform particles. */
static double uniform_support(int dim, int32_t n) {
  return dim == 3 ? cbrt(40.0 / (4.18879 * n)) : sqrt(18.0 / (3.14159 * n));
}

static void fill_uniform(int dim, int32_t n, double (*place)[4], uint64_t seed) {
  const double h = fmin(0.45, uniform_support(dim, n));
  for (int32_t i = 0; i < n; i++) {
    for (int a = 0; a < dim; a++) place[i][a] = cloud_random(&seed);
    place[i][3] = h * (0.8 + 0.4 * cloud_random(&seed));
  }
}

/* A bare lattice whose supports are lattice distances: many ties r = H. */
static void fill_lattice(int dim, int32_t n, double (*place)[4], uint64_t seed) {
  const int32_t side = 16;
  (void)seed;
  for (int32_t i = 0; i < n; i++) {
    place[i][0] = (i % side) / 16.0;
    place[i][1] = (i / side % side) / 16.0;
    place[i][2] = dim == 3 ? (i / (side * side) % side) / 16.0 : 0.0;
    place[i][3] = (1 + i % 3) / 16.0;
  }
}

/* Every fifth support is 1000 times its neighbours'. */
static void fill_mixed(int dim, int32_t n, double (*place)[4], uint64_t seed) {
  fill_uniform(dim, n, place, seed);
  for (int32_t i = 0; i < n; i++) place[i][3] = i % 5 == 0 ? 0.3 : 3e-4;
}

/* Most particles in a ball 1000 times smaller than the box, a few large ones around it. */
static void fill_cluster(int dim, int32_t n, double (*place)[4], uint64_t seed) {
  const double h = uniform_support(dim, n);
  for (int32_t i = 0; i < n; i++) {
    const bool far = i % 20 == 0;
    for (int a = 0; a < dim; a++)
      place[i][a] = far ? cloud_random(&seed) : 0.999 + 2e-3 * (cloud_random(&seed) - 0.5);
    place[i][3] = far ? 0.02 + 0.25 * cloud_random(&seed) : 2e-3 * fmin(0.45, h);
  }
}

/* Resolution falls with the distance from a point: supports over more than three decades. */
static void fill_gradient(int dim, int32_t n, double (*place)[4], uint64_t seed) {
  for (int32_t i = 0; i < n; i++) {
    const double radius = 0.49 * pow(1e-4, cloud_random(&seed));
    double u[3] = {0.0}, norm = 0.0;
    while (!(norm > 0.01 && norm < 1.0)) {
      norm = 0.0;
      for (int a = 0; a < dim; a++) {
        u[a] = 2.0 * cloud_random(&seed) - 1.0;
        norm += u[a] * u[a];
      }
    }
    for (int a = 0; a < dim; a++) place[i][a] = 0.5 + radius * u[a] / sqrt(norm);
    place[i][3] = 0.4 * radius;
  }
}

static void fill_line(int dim, int32_t n, double (*place)[4], uint64_t seed) {

  for (int32_t i = 0; i < n; i++) {
    place[i][1] = cloud_random(&seed);
    place[i][0] = dim == 3 ? 0.25 : place[i][1];
    place[i][3] = fmin(0.5, 20.0 / n);
  }
}

static void fill_plane(int dim, int32_t n, double (*place)[4], uint64_t seed) {
  for (int32_t i = 0; i < n; i++) {
    place[i][0] = cloud_random(&seed);
    place[i][dim - 1] = cloud_random(&seed);
    place[i][3] = fmin(0.5, sqrt(15.0 / n));
  }
}

static void fill_point(int dim, int32_t n, double (*place)[4], uint64_t seed) {
  for (int32_t i = 0; i < n; i++) {
    for (int a = 0; a < dim; a++) place[i][a] = 0.125;
    place[i][3] = i % 4 == 0 ? 0.0 : 1e-3 * cloud_random(&seed);
  }
}

/* Three particles at each place. */
static void fill_triplets(int dim, int32_t n, double (*place)[4], uint64_t seed) {
  fill_uniform(dim, n, place, seed);
  for (int32_t i = 0; i < n; i++) memcpy(place[i], place[i - i % 3], sizeof place[i]);
}

/* Supports of half the box: every leaf straddles the nearest image's cut. */
static void fill_huge(int dim, int32_t n, double (*place)[4], uint64_t seed) {
  fill_uniform(dim, n, place, seed);
  for (int32_t i = 0; i < n; i++) place[i][3] = i % 40 == 0 ? 0.5 : place[i][3];
}

/* A speck at a face of the box, its supports near the round-off of positions. */
static void fill_speck(int dim, int32_t n, double (*place)[4], uint64_t seed) {
  for (int32_t i = 0; i < n; i++) {
    const double x = 1.4e-13 * (cloud_random(&seed) - 0.5);
    place[i][0] = x < 0.0 ? 1.0 + x : x;
    for (int a = 1; a < dim; a++) place[i][a] = 0.7 + 1.4e-13 * (cloud_random(&seed) - 0.5);
    place[i][3] = 5e-14 * (1 + i % 3);
  }
}

const cloud_kind cloud_kinds[] = {
    {"uniform", fill_uniform}, {"lattice", fill_lattice},   {"mixed", fill_mixed},
    {"cluster", fill_cluster}, {"gradient", fill_gradient}, {"line", fill_line},
    {"plane", fill_plane},     {"point", fill_point},       {"triplets", fill_triplets},
    {"huge", fill_huge},       {"speck", fill_speck},       {NULL, NULL},
};

/* Bits of the coordinates interleaved: neighbours along the curve are near each other. */
static uint64_t curve_key(const double *place) {
  uint64_t key = 0;
  for (int bit = 19; bit >= 0; bit--)
    for (int a = 0; a < 3; a++) key = 2 * key + ((uint32_t)(place[a] * 0x1p20) >> bit & 1u);
  return key;
}

static int key_order(const void *a, const void *b) {
  const uint64_t ka = curve_key(a), kb = curve_key(b);
  return (ka > kb) - (ka < kb);
}

/* Marks ghosts and numbers the storage: owned ascending, then ghosts descending. */
static void cloud_number(cloud *c, double ghosts, uint64_t seed) {
  int32_t last = c->n;
  for (int32_t i = 0; i < c->n; i++) {
    const bool ghost = cloud_random(&seed) < ghosts;
    c->store[i] = ghost ? --last : c->rows;
    if (!ghost) c->row[c->rows++] = i;
  }
}

cloud cloud_create(const cloud_kind *kind, int dim, unsigned periodic, double unit, int32_t n,
                   double ghosts, uint64_t seed) {
  cloud c = {.n = n, .domain = {.dim = dim, .thickness = 1.0}};
  for (int a = 0; a < 3; a++) {
    const bool wraps = periodic >> a & 1u && a < dim;
    c.domain.hi[a] = a < dim ? unit : 0.0;
    c.domain.period[a] = wraps ? unit : 0.0;
    c.domain.half[a] = wraps ? unit / 2.0 : INFINITY;
  }
  c.place = calloc((size_t)n + 1, sizeof *c.place);
  c.store = malloc(sizeof *c.store * ((size_t)n + 1));
  c.row = malloc(sizeof *c.row * ((size_t)n + 1));
  kind->fill(dim, n, c.place, seed);
  qsort(c.place, (size_t)n, sizeof *c.place, key_order);
  for (int32_t i = 0; i < n; i++)
    for (int a = 0; a < 4; a++) c.place[i][a] *= unit;
  cloud_number(&c, ghosts, seed + 1);
  const size_t boxes = (size_t)wend_tree_boxes(n) + 1;
  wend_tree_build(&c.tree, n, (const double(*)[4])c.place, malloc(boxes * sizeof *c.tree.lo),
                  malloc(boxes * sizeof *c.tree.hi));
  return c;
}

void cloud_destroy(cloud *c) {
  free(c->place);
  free(c->store);
  free(c->row);
  free(c->tree.lo);
  free(c->tree.hi);
}

double cloud_distance2(const cloud *c, int32_t i, int32_t j) {
  double r2 = 0.0;
  for (int a = 0; a < 3; a++) {
    const double direct = fabs(c->place[i][a] - c->place[j][a]);
    const double around = c->domain.period[a] > 0.0 ? c->domain.period[a] - direct : INFINITY;
    const double d = fmin(direct, around);
    r2 += d * d;
  }
  return r2;
}
