/* SPDX-License-Identifier: LGPL-3.0-or-later
 * post.c: messages among peers, all under way at once. */
#include "flight.h"

enum { TAG = 17 };

static wend_status judge(wend_team *team, bool failed) {
  if (failed)
    wend_fail(team, WEND_ERR_MPI, "rank %d could not exchange with its neighbours", team->rank);
  return team->status;
}

wend_status wend_post_begin(wend_team *team, int peers, const int *peer, wend_post *post,
                            MPI_Datatype type) {
  bool failed = false;
  for (int k = 0; k < peers; k++) {
    post[k].sending = post[k].receiving = MPI_REQUEST_NULL;
    if (post[k].recv_count > 0)
      failed |= MPI_Irecv(post[k].recv, post[k].recv_count, type, peer[k], TAG, team->comm,
                          &post[k].receiving) != MPI_SUCCESS;
  }
  for (int k = 0; k < peers; k++)
    if (post[k].send_count > 0)
      failed |= MPI_Isend(post[k].send, post[k].send_count, type, peer[k], TAG, team->comm,
                          &post[k].sending) != MPI_SUCCESS;
  return judge(team, failed);
}

wend_status wend_post_end(wend_team *team, int peers, wend_post *post) {
  bool failed = false;
  for (int k = 0; k < peers; k++) {
    failed |= MPI_Wait(&post[k].receiving, MPI_STATUS_IGNORE) != MPI_SUCCESS;
    failed |= MPI_Wait(&post[k].sending, MPI_STATUS_IGNORE) != MPI_SUCCESS;
  }
  return judge(team, failed);
}

wend_status wend_post_all(wend_team *team, int peers, const int *peer, wend_post *post,
                          MPI_Datatype type) {
  wend_post_begin(team, peers, peer, post, type);
  return wend_post_end(team, peers, post);
}
