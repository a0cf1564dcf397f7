/* SPDX-License-Identifier: LGPL-3.0-or-later
 * halo_build.c: finds the ghosts of owned particles.
 *
 * Every rank shows all others one box; those whose boxes may hold pairs (near ranks) show each
 * other finer boxes, a level of their trees; then each sends the particles that any such box
 * may need. A box knows its largest support, so one large particle widens one small box only.
 */
#include "boxes.h"
#include "choose.h"
#include "flight.h"
#include <stdlib.h>
#include <string.h>

enum { BOX_WORDS = sizeof(wend_box) / sizeof(double), FINE_BOXES = 512 };

typedef struct build {
  wend_tree tree;
  wend_box *fine; /* [fine_boxes] what this rank shows to near ranks */
  int32_t fine_boxes;
  wend_box *all;    /* [size] one box a rank; hi[3]: its number of fine boxes, 0 where empty */
  int near;         /* near ranks */
  int *rank;        /* [near] ascending */
  wend_post *post;  /* [near] */
  wend_box **shown; /* [near] their fine boxes */
  wend_box *boxes;  /* the memory of `shown` */
  wend_chosen chosen; /* particles to send, near rank after near rank */
  int *send, *recv;   /* [near] counts */
} build;

static void build_free(build *b) {
  free(b->tree.lo);
  free(b->tree.hi);
  free(b->fine);
  free(b->all);
  free(b->rank);
  free(b->post);
  free(b->shown);
  free(b->boxes);
  free(b->send);
  free(b->recv);
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

/* The tree of this rank, and the finest level of at most FINE_BOXES boxes. */
static wend_status plant(wend_team *team, int32_t owned, const double (*place)[4], build *b) {
  const int32_t boxes = wend_tree_boxes(owned);
  double(*lo)[4] = wend_allocate(team, boxes, sizeof *lo);
  double(*hi)[4] = wend_allocate(team, boxes, sizeof *hi);
  b->tree.lo = lo;
  b->tree.hi = hi;
  b->fine = wend_allocate(team, FINE_BOXES, sizeof *b->fine);
  b->all = wend_allocate(team, team->size, sizeof *b->all);
  check_places(team, owned, place);
  const wend_status status = wend_agree(team);
  if (status != WEND_OK || owned == 0) return status;
  wend_tree_build(&b->tree, owned, place, lo, hi);
  int level = 0;
  const int32_t *const offset = b->tree.offset;
  while (offset[level + 1] - offset[level] > FINE_BOXES) level++;
  b->fine_boxes = offset[level + 1] - offset[level];
  for (int32_t k = 0; k < b->fine_boxes; k++)
    b->fine[k] = tree_box(&b->tree, offset[level] + k);
  return WEND_OK;
}

/* Near ranks: a test that is symmetric bit for bit, so both ends agree on it. */
static wend_status find_near(wend_team *team, const wend_domain *domain, build *b) {
  wend_box own = {{0}, {0}};
  if (b->tree.n > 0) own = tree_box(&b->tree, b->tree.offset[b->tree.levels] - 1);
  own.hi[3] = b->fine_boxes;
  if (MPI_Allgather(&own, BOX_WORDS, MPI_DOUBLE, b->all, BOX_WORDS, MPI_DOUBLE, team->comm) !=
      MPI_SUCCESS)
    wend_fail(team, WEND_ERR_MPI, "ranks could not show each other their boxes");
  b->rank = wend_allocate(team, team->size, sizeof *b->rank);
  int64_t shown = 0;
  for (int r = 0; r < team->size && b->rank != NULL && b->fine_boxes > 0; r++) {
    if (r == team->rank || b->all[r].hi[3] == 0) continue;
    if (!wend_boxes_near(domain, &own, &b->all[r])) continue;
    b->rank[b->near++] = r;
    shown += (int64_t)b->all[r].hi[3];
  }
  b->post = wend_allocate(team, b->near, sizeof *b->post);
  b->shown = wend_allocate(team, b->near, sizeof *b->shown);
  b->send = wend_allocate(team, b->near, sizeof *b->send);
  b->recv = wend_allocate(team, b->near, sizeof *b->recv);
  b->boxes = wend_allocate(team, shown, sizeof *b->boxes);
  return wend_agree(team);
}

static void show_boxes(wend_team *team, build *b) {
  wend_box *next = b->boxes;
  for (int k = 0; k < b->near; k++) {
    const int32_t count = (int32_t)b->all[b->rank[k]].hi[3];
    b->shown[k] = next;
    b->post[k] = (wend_post){.send = b->fine,
                             .recv = next,
                             .send_count = b->fine_boxes * BOX_WORDS,
                             .recv_count = count * BOX_WORDS};
    next += count;
  }
  wend_post_all(team, b->near, b->rank, b->post, MPI_DOUBLE);
}

/* What each near rank may need, and how much each will send. */
static wend_status choose(wend_team *team, const wend_domain *domain, const double (*place)[4],
                          build *b) {
  for (int k = 0; k < b->near && team->status == WEND_OK; k++) {
    const int32_t before = b->chosen.n;
    wend_choose(team, domain, &b->tree, place, (int32_t)b->all[b->rank[k]].hi[3], b->shown[k],
                &b->chosen);
    b->send[k] = b->chosen.n - before;
  }
  const wend_status status = wend_agree(team);
  if (status != WEND_OK) return status;
  for (int k = 0; k < b->near; k++)
    b->post[k] =
        (wend_post){.send = &b->send[k], .recv = &b->recv[k], .send_count = 1, .recv_count = 1};
  wend_post_all(team, b->near, b->rank, b->post, MPI_INT);
  return wend_agree(team);
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
  build b = {0};
  wend_status status = WEND_OK;
  memset(halo, 0, sizeof *halo);
  WEND_TRY(plant(team, owned, place, &b));
  WEND_TRY(find_near(team, domain, &b));
  show_boxes(team, &b);
  WEND_TRY(choose(team, domain, place, &b));
  WEND_TRY(settle(team, owned, &b, halo));
done:
  if (status != WEND_OK) wend_halo_reset(halo);
  build_free(&b);
  return status;
}
