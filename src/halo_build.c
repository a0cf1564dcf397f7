/* SPDX-License-Identifier: LGPL-3.0-or-later
 * halo_build.c: finds the ghosts of owned particles.
 *
 * Every rank shows all others one box; those whose boxes may hold pairs (near ranks) show each
 * other some hundred boxes, then finer ones where those touch, down to leaves of the tree where
 * they are few; then each sends the particles that any such box may need. A box knows its
 * largest support, so one large particle widens one small box only. */
#include "boxes.h"
#include "choose.h"
#include "flight.h"
#include <stdlib.h>
#include <string.h>

enum { BOX_WORDS = sizeof(wend_box) / sizeof(double), COARSE_BOXES = 512, FINE_BOXES = 512 };

typedef struct build {
  const wend_domain *domain;
  const double (*place)[4];
  wend_tree tree;
  wend_box *coarse; /* [coarse_boxes] what this rank shows to all near ranks */
  int32_t coarse_boxes;
  wend_box *all;   /* [size] one box a rank; hi[3]: its number of coarse boxes, 0 where empty */
  int near;        /* near ranks */
  int *rank;       /* [near] ascending */
  wend_post *post; /* [near] */
  int *send, *recv;   /* [near] items going out and coming in: boxes, particles at the end */
  wend_box *fine;     /* boxes shown to near ranks, near rank after near rank */
  wend_box *seen;     /* boxes that near ranks showed, near rank after near rank */
  wend_chosen chosen; /* boxes, at the end particles, for near rank after near rank */
} build;

static void build_free(build *b) {
  free(b->tree.lo);
  free(b->tree.hi);
  free(b->coarse);
  free(b->all);
  free(b->rank);
  free(b->post);
  free(b->send);
  free(b->recv);
  free(b->fine);
  free(b->seen);
  wend_chosen_reset(&b->chosen);
}

static void check_places(wend_team *team, int32_t owned, const double (*place)[4]) {
  for (int32_t i = 0; i < owned; i++) {
    const double *p = place[i];
    if (isfinite(p[0]) && isfinite(p[1]) && isfinite(p[2]) && isfinite(p[3]) && p[3] >= 0)
      continue;
    wend_fail(team, WEND_ERR_PARTICLES,
              "particle %d of rank %d, at (%.9g, %.9g, %.9g) with support %.9g, cannot have "
              "neighbours: give it a finite place and a support of 0 or more",
              (int)i, team->rank, p[0], p[1], p[2], p[3]);
    return;
  }
}

static wend_box tree_box(const wend_tree *tree, int32_t k) {
  wend_box box;
  memcpy(box.lo, tree->lo[k], sizeof box.lo);
  memcpy(box.hi, tree->hi[k], sizeof box.hi);
  return box;
}

/* The tree of this rank, and its finest level of at most COARSE_BOXES boxes. */
static wend_status plant(wend_team *team, int32_t owned, build *b) {
  const int32_t boxes = wend_tree_boxes(owned);
  double(*lo)[4] = wend_allocate(team, boxes, sizeof *lo);
  double(*hi)[4] = wend_allocate(team, boxes, sizeof *hi);
  b->tree.lo = lo;
  b->tree.hi = hi;
  b->coarse = wend_allocate(team, COARSE_BOXES, sizeof *b->coarse);
  b->all = wend_allocate(team, team->size, sizeof *b->all);
  check_places(team, owned, b->place);
  const wend_status status = wend_agree(team);
  if (status != WEND_OK || owned == 0) return status;
  wend_tree_build(&b->tree, owned, b->place, lo, hi);
  int level = 0;
  const int32_t *const offset = b->tree.offset;
  while (offset[level + 1] - offset[level] > COARSE_BOXES) level++;
  b->coarse_boxes = offset[level + 1] - offset[level];
  for (int32_t k = 0; k < b->coarse_boxes; k++)
    b->coarse[k] = tree_box(&b->tree, offset[level] + k);
  return WEND_OK;
}

/* Near ranks: a test that is symmetric bit for bit, so both ends agree on it. */
static wend_status find_near(wend_team *team, build *b) {
  wend_box own = {{0}, {0}};
  if (b->tree.n > 0) own = tree_box(&b->tree, b->tree.offset[b->tree.levels] - 1);
  own.hi[3] = b->coarse_boxes;
  if (MPI_Allgather(&own, BOX_WORDS, MPI_DOUBLE, b->all, BOX_WORDS, MPI_DOUBLE, team->comm) !=
      MPI_SUCCESS)
    wend_fail(team, WEND_ERR_MPI, "ranks could not show each other their boxes");
  b->rank = wend_allocate(team, team->size, sizeof *b->rank);
  for (int r = 0; r < team->size && b->rank != NULL && b->tree.n > 0; r++) {
    if (r == team->rank || b->all[r].hi[3] == 0) continue;
    if (wend_boxes_near(b->domain, &own, &b->all[r])) b->rank[b->near++] = r;
  }
  b->post = wend_allocate(team, b->near, sizeof *b->post);
  b->send = wend_allocate(team, b->near, sizeof *b->send);
  b->recv = wend_allocate(team, b->near, sizeof *b->recv);
  return wend_agree(team);
}

static wend_status trade_counts(wend_team *team, build *b) {
  for (int k = 0; k < b->near; k++)
    b->post[k] =
        (wend_post){.send = &b->send[k], .recv = &b->recv[k], .send_count = 1, .recv_count = 1};
  wend_post_all(team, b->near, b->rank, b->post, MPI_INT);
  return wend_agree(team);
}

/* Shows near rank k send[k] boxes, each its own ones or all the same; `seen` receives theirs.
 */
static wend_status trade_boxes(wend_team *team, const wend_box *shown, bool same, build *b) {
  int64_t seen = 0;
  for (int k = 0; k < b->near; k++) seen += b->recv[k];
  free(b->seen);
  b->seen = wend_allocate(team, seen, sizeof *b->seen);
  const wend_status status = wend_agree(team);
  if (status != WEND_OK) return status;
  wend_box *next = b->seen;
  for (int k = 0; k < b->near; k++) {
    b->post[k] = (wend_post){.send = shown,
                             .recv = next,
                             .send_count = b->send[k] * BOX_WORDS,
                             .recv_count = b->recv[k] * BOX_WORDS};
    shown += same ? 0 : b->send[k];
    next += b->recv[k];
  }
  wend_post_all(team, b->near, b->rank, b->post, MPI_DOUBLE);
  return wend_agree(team);
}

static wend_status show_coarse(wend_team *team, build *b) {
  for (int k = 0; k < b->near; k++) {
    b->send[k] = b->coarse_boxes;
    b->recv[k] = (int)b->all[b->rank[k]].hi[3];
  }
  return trade_boxes(team, b->coarse, true, b);
}

/* Chooses what near ranks may need by the boxes seen last, and tells them how much it is. */
static wend_status choose(wend_team *team, bool particles, build *b) {
  const wend_box *seen = b->seen;
  b->chosen.n = 0;
  for (int k = 0; k < b->near && team->status == WEND_OK; k++) {
    const int32_t before = b->chosen.n;
    if (particles)
      wend_choose(team, b->domain, &b->tree, b->place, b->recv[k], seen, &b->chosen);
    else
      wend_choose_boxes(team, b->domain, &b->tree, b->recv[k], seen, FINE_BOXES, &b->chosen);
    seen += b->recv[k];
    b->send[k] = b->chosen.n - before;
  }
  const wend_status status = wend_agree(team);
  return status != WEND_OK ? status : trade_counts(team, b);
}

static wend_status show_fine(wend_team *team, build *b) {
  const wend_status status = choose(team, false, b);
  if (status != WEND_OK) return status;
  b->fine = wend_allocate(team, b->chosen.n, sizeof *b->fine);
  for (int32_t k = 0; k < b->chosen.n && b->fine != NULL; k++)
    b->fine[k] = tree_box(&b->tree, b->chosen.list[k]);
  return trade_boxes(team, b->fine, false, b);
}

/* Peers are the near ranks that send or receive something: both ends know both counts. */
static wend_status settle(wend_team *team, int32_t owned, build *b, wend_halo *halo) {
  int64_t ghosts = 0;
  for (int k = 0; k < b->near; k++) ghosts += b->recv[k];
  if (ghosts + owned > INT32_MAX)
    wend_fail(team, WEND_ERR_PARTICLES,
              "rank %d would hold %lld particles and ghosts, more than %d: use more ranks",
              team->rank, (long long)(ghosts + owned), INT32_MAX);
  halo->peer = wend_allocate(team, (int64_t)b->near + 1, sizeof *halo->peer);
  halo->send_first = wend_allocate(team, (int64_t)b->near + 1, sizeof *halo->send_first);
  halo->recv_first = wend_allocate(team, (int64_t)b->near + 1, sizeof *halo->recv_first);
  halo->send_list = wend_allocate(team, b->chosen.n, sizeof *halo->send_list);
  halo->flight = wend_flight_make(team, b->near);
  const wend_status status = wend_agree(team);
  if (status != WEND_OK) return status;
  if (b->chosen.n > 0)
    memcpy(halo->send_list, b->chosen.list, (size_t)b->chosen.n * sizeof *halo->send_list);
  halo->owned = owned;
  halo->ghosts = (int32_t)ghosts;
  for (int k = 0; k < b->near; k++) {
    if (b->send[k] == 0 && b->recv[k] == 0) continue;
    const int p = halo->peers++;
    halo->peer[p] = b->rank[k];
    halo->send_first[p + 1] = halo->send_first[p] + b->send[k];
    halo->recv_first[p + 1] = halo->recv_first[p] + b->recv[k];
  }
  return WEND_OK;
}

wend_status wend_halo_build(wend_team *team, const wend_domain *domain, int32_t owned,
                            const double (*place)[4], wend_halo *halo) {
  build b = {.domain = domain, .place = place};
  wend_status status = WEND_OK;
  memset(halo, 0, sizeof *halo);
  WEND_TRY(plant(team, owned, &b));
  WEND_TRY(find_near(team, &b));
  WEND_TRY(show_coarse(team, &b));
  WEND_TRY(show_fine(team, &b));
  WEND_TRY(choose(team, true, &b));
  WEND_TRY(settle(team, owned, &b, halo));
done:
  if (status != WEND_OK) wend_halo_reset(halo);
  build_free(&b);
  return status;
}
