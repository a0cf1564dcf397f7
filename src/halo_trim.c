/* SPDX-License-Identifier: LGPL-3.0-or-later
 * halo_trim.c: drops the ghosts that no pair needs, on both sides. */
#include "flight.h"
#include <stdlib.h>

/* Moves the wanted entries forward; returns how many there are. */
static int32_t squeeze(int32_t first, int32_t last, const bool *wanted, int32_t out,
                       int32_t *list) {
  for (int32_t k = first; k < last; k++)
    if (wanted[k]) list[out++] = list[k];
  return out;
}

static int32_t count_used(int32_t first, int32_t last, const bool *used, int32_t next,
                          int32_t *renumber) {
  for (int32_t g = first; g < last; g++) renumber[g] = used[g] ? next++ : -1;
  return next;
}

/* A peer that neither sends nor receives any more is dropped by both ends. */
static void drop(wend_halo *halo, const bool *used, const bool *wanted, int32_t *renumber) {
  int peers = 0;
  int32_t sent = 0, seen = 0;
  int32_t send_start = 0, recv_start = 0;
  for (int p = 0; p < halo->peers; p++) {
    const int32_t send_end = halo->send_first[p + 1], recv_end = halo->recv_first[p + 1];
    const int32_t sent_now = squeeze(send_start, send_end, wanted, sent, halo->send_list);
    const int32_t seen_now = count_used(recv_start, recv_end, used, seen, renumber);
    send_start = send_end;
    recv_start = recv_end;
    if (sent_now == sent && seen_now == seen) continue;
    halo->peer[peers++] = halo->peer[p];
    halo->send_first[peers] = sent = sent_now;
    halo->recv_first[peers] = seen = seen_now;
  }
  halo->peers = peers;
  halo->ghosts = seen;
}

wend_status wend_halo_trim(wend_team *team, wend_halo *halo, const bool *used,
                           int32_t *renumber) {
  wend_status status = WEND_OK;
  const int32_t sent = halo->peers > 0 ? halo->send_first[halo->peers] : 0;
  bool *wanted = wend_allocate(team, sent, sizeof *wanted);
  wend_post *post = wend_allocate(team, halo->peers, sizeof *post);
  WEND_TRY(wend_agree(team));
  for (int p = 0; p < halo->peers; p++)
    post[p] = (wend_post){.send = used + halo->recv_first[p],
                          .recv = wanted + halo->send_first[p],
                          .send_count = halo->recv_first[p + 1] - halo->recv_first[p],
                          .recv_count = halo->send_first[p + 1] - halo->send_first[p]};
  wend_post_all(team, halo->peers, halo->peer, post, MPI_C_BOOL);
  WEND_TRY(wend_agree(team));
  drop(halo, used, wanted, renumber);
done:
  free(post);
  free(wanted);
  return status;
}
