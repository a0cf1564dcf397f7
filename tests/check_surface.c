/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_surface.c: free surfaces against the definition by angles; how many particles of a
 * ball's surface are found, and how many inside gas are found wrongly. */
#include "surface.h"

#include "cut.h"
#include "lattice.h"
#include "neighbours.h"
#include "supports.h"
#include "web.h"

#include <check.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static wend_team team;

/* ---- the definition ---- */

static const web_plan plans[] = {
    {2, 0, 12, 0.2, 2.6, 0}, {2, 1, 12, 1.0, 2.6, 3}, {2, 0, 5, 0.5, 1.2, 0},
    {3, 0, 6, 0.2, 2.3, 0},  {3, 5, 6, 1.0, 2.3, 2},  {3, 0, 6, 1.0, 1.1, 0},
};
enum { PLANS = sizeof plans / sizeof plans[0] };

static double arm(const web *w, int32_t i, int32_t j, double r[3]) {
  double r2 = 0;
  for (int a = 0; a < 3; a++) {
    const double period = w->l.domain.period[a], d = w->l.place[j][a] - w->l.place[i][a];
    r[a] = period > 0 ? remainder(d, period) : d;
    r2 += r[a] * r[a];
  }
  return sqrt(r2);
}

/* From all particles, without lists: kernel-weighted mean arm, and the least angle to its
 * opposite. Wendland C2 but for its norm, which cancels. */
static bool surface_by_angles(const web *w, int32_t i) {
  double n[3] = {0}, sum = 0, r[3], least = M_PI;
  const double h = w->l.place[i][3];
  for (int32_t j = 0; j < w->l.n; j++) {
    const double q = arm(w, i, j, r) / h;
    const double weight = j != i && q < 1 ? pow(1 - q, 4) * (1 + 4 * q) : 0;
    for (int a = 0; a < 3; a++) n[a] -= weight * r[a];
    sum += weight;
  }
  const double length = sqrt(n[0] * n[0] + n[1] * n[1] + n[2] * n[2]);
  for (int32_t j = 0; j < w->l.n; j++) {
    const double distance = arm(w, i, j, r);
    if (j == i || distance >= fmax(h, w->l.place[j][3])) continue;
    const double cosine = (n[0] * r[0] + n[1] * r[1] + n[2] * r[2]) / (length * distance);
    least = fmin(least, acos(fmax(-1, fmin(1, cosine))));
  }
  return length > 0.1 * h * sum && least >= M_PI / 4;
}

START_TEST(surfaces_follow_the_definition) {
  int on = 0, off = 0;
  for (uint64_t seed = 1; seed <= 3; seed++) {
    web w = web_create(&plans[_i], seed);
    for (int32_t i = 0; i < w.l.n; i++) {
      ck_assert_int_eq(w.surface[i], surface_by_angles(&w, i));
      on += w.surface[i];
      off += !w.surface[i];
    }
    web_destroy(&w);
  }
  ck_assert(on > 10 && off > 10);
}
END_TEST

/* A bare square lattice: exactly the outermost row is a surface. */
START_TEST(borders_of_a_lattice_are_found) {
  const web_plan plan = {2, 0, 12, 0, 2.6, 0};
  web w = web_create(&plan, 1);
  for (int32_t i = 0; i < w.l.n; i++) {
    const int x = i % 12, y = i / 12;
    ck_assert_int_eq(w.surface[i], x == 0 || x == 11 || y == 0 || y == 11);
  }
  web_destroy(&w);
}
END_TEST

/* No neighbours, no side to be on. */
START_TEST(lone_particles_are_not_marked) {
  const web_plan lone = {3, 0, 1, 0, 0.3, 0};
  web w = web_create(&lone, 1);
  ck_assert_int_eq(w.surface[0], 0);
  web_destroy(&w);
}
END_TEST

/* ---- how well it works ---- */

/* Marked particles of a set, supports from the neighbour number 48. */
typedef struct found {
  wend_particles particles;
  wend_neighbours near;
  unsigned char *surface;
} found;

static found find(const wend_domain *domain, wend_particles particles) {
  found f = {.particles = particles};
  ck_assert(wend_cut_particles(&team, domain, &f.particles, NULL) == WEND_OK);
  const int32_t n = f.particles.n;
  double(*place)[4] = calloc((size_t)n, sizeof *place);
  for (int32_t i = 0; i < n; i++)
    for (int a = 0; a < 3; a++) place[i][a] = f.particles.column[WEND_X + a][i];
  const wend_smoothing *smoothing = wend_smoothing_find("wendland-c2");
  ck_assert(wend_supports_find(&team, domain, wend_smoothing_count(), 48, &f.particles,
                               place) == WEND_OK);
  ck_assert(wend_neighbours_init(&team, domain, &f.particles, (const double(*)[4])place,
                                 &f.near) == WEND_OK);
  f.surface = calloc((size_t)n, 1);
  wend_surface_find(&f.near.pairs, f.near.all, domain, smoothing,
                    (const double(*)[4])f.near.place, f.surface);
  free(place);
  return f;
}

static void found_destroy(found *f) {
  free(f->surface);
  wend_neighbours_reset(&f->near);
  wend_particles_reset(&f->particles);
}

static const double corner[2][3] = {{-1.25, -1.25, -1.25}, {1.25, 1.25, 1.25}};

/* A ball of radius 1, `side` spacings a diameter. */
static wend_particles ball(const wend_domain *domain, int side, double jitter, uint64_t seed) {
  const int across = 5 * side / 4;
  const wend_lattice lattice = {{across, across, across}, jitter, seed};
  wend_particles p;
  ck_assert(wend_lattice_fill(&team, domain, &lattice, 0, &p) == WEND_OK);
  int32_t kept = 0;
  for (int32_t i = 0; i < p.n; i++) {
    const double x = p.column[WEND_X][i], y = p.column[WEND_Y][i], z = p.column[WEND_Z][i];
    if (x * x + y * y + z * z >= 1) continue;
    p.id[kept] = p.id[i];
    p.column[WEND_X][kept] = x;
    p.column[WEND_Y][kept] = y;
    p.column[WEND_Z][kept++] = z;
  }
  p.n = kept;
  return p;
}

/* Bars of a ball: least share of the outermost half spacing. Inside means deeper than two
 * spacings. */
static const struct {
  int side;
  double jitter, least;
} balls[] = {{28, 0.2, 0.98}, {32, 0.2, 0.98}, {28, 0.5, 0.85}, {32, 0.5, 0.85}};
enum { BALLS = sizeof balls / sizeof balls[0] };

START_TEST(surfaces_of_balls_are_found) {
  const wend_domain domain = wend_scene_domain(3, corner[0], corner[1], false);
  const double spacing = 2.0 / balls[_i].side;
  for (uint64_t seed = 1; seed <= 2; seed++) {
    found f = find(&domain, ball(&domain, balls[_i].side, balls[_i].jitter, seed));
    int outer = 0, hit = 0, inner = 0, wrong = 0;
    for (int32_t i = 0; i < f.near.owned; i++) {
      const double *x = f.near.place[i];
      const double depth = 1 - sqrt(x[0] * x[0] + x[1] * x[1] + x[2] * x[2]);
      outer += depth < spacing / 2;
      hit += depth < spacing / 2 && f.surface[i];
      inner += depth > 2 * spacing;
      wrong += depth > 2 * spacing && f.surface[i];
    }
    printf("ball of %d a diameter, jitter %.1f: %d of %d (%.2f%%) of the outermost half "
           "spacing found, %d of %d inside\n",
           balls[_i].side, balls[_i].jitter, hit, outer, 100.0 * hit / outer, wrong, inner);
    ck_assert_double_ge((double)hit / outer, balls[_i].least);
    ck_assert_int_eq(wrong, 0);
    found_destroy(&f);
  }
}
END_TEST

/* ---- jumps of resolution ---- */

/* A periodic cube; the half x > 0 is `ratio` times finer. Nothing in it is a surface. */
static wend_particles two_lattices(const wend_domain *domain, int side, int ratio,
                                   double jitter, uint64_t seed) {
  wend_domain half = *domain;
  wend_lattice lattice = {{side / 2, side, side}, jitter, seed};
  wend_particles coarse, fine;
  half.hi[0] = 0;
  ck_assert(wend_lattice_fill(&team, &half, &lattice, 0, &coarse) == WEND_OK);
  half.lo[0] = 0;
  half.hi[0] = domain->hi[0];
  for (int a = 0; a < 3; a++) lattice.side[a] *= ratio;
  ck_assert(wend_lattice_fill(&team, &half, &lattice, 0, &fine) == WEND_OK);
  for (int32_t i = 0; i < fine.n; i++) fine.id[i] += (uint64_t)coarse.n;
  ck_assert(wend_lattice_join(&team, &coarse, &fine) == WEND_OK);
  wend_particles_reset(&fine);
  return coarse;
}

static const struct {
  int side, ratio;
  double jitter, most;
} jumps[] = {{20, 1, 0.2, 0},    {20, 1, 0.5, 0},    {16, 2, 0.2, 1e-3},
             {16, 2, 0.5, 1e-3}, {10, 4, 0.2, 2e-3}, {10, 4, 0.5, 2e-3}};
enum { JUMPS = sizeof jumps / sizeof jumps[0] };

START_TEST(insides_are_not_surfaces) {
  const wend_domain domain = wend_scene_domain(3, corner[0], corner[1], true);
  const double spacing = 2.5 / jumps[_i].side;
  int near = 0, wrong = 0;
  found f = find(&domain,
                 two_lattices(&domain, jumps[_i].side, jumps[_i].ratio, jumps[_i].jitter, 1));
  const int all = f.near.owned;
  for (int32_t i = 0; i < all; i++) {
    const double x = f.near.place[i][0];
    near += fmin(fabs(x), 1.25 - fabs(x)) < 2 * spacing;
    wrong += f.surface[i];
  }
  found_destroy(&f);
  printf("jump by %d, jitter %.1f: %d of %d particles found wrongly (%.1e), %.1e of those "
         "within two spacings of a jump\n",
         jumps[_i].ratio, jumps[_i].jitter, wrong, all, (double)wrong / all,
         (double)wrong / near);
  ck_assert_double_le((double)wrong / all, jumps[_i].most);
}
END_TEST

int main(int count, char **arguments) {
  MPI_Init(&count, &arguments);
  wend_team_init(&team, MPI_COMM_WORLD);
  Suite *suite = suite_create("surface");
  TCase *tc = tcase_create("definition");
  tcase_add_loop_test(tc, surfaces_follow_the_definition, 0, PLANS);
  tcase_add_test(tc, borders_of_a_lattice_are_found);
  tcase_add_test(tc, lone_particles_are_not_marked);
  suite_add_tcase(suite, tc);
  tc = tcase_create("figures");
  tcase_add_loop_test(tc, surfaces_of_balls_are_found, 0, BALLS);
  tcase_add_loop_test(tc, insides_are_not_surfaces, 0, JUMPS);
  suite_add_tcase(suite, tc);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  wend_team_reset(&team);
  MPI_Finalize();
  return failed != 0;
}
