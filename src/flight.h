/* SPDX-License-Identifier: LGPL-3.0-or-later
 * flight.h: what the files of the halo share: messages among peers, and an exchange under way.
 */
#ifndef WEND_SRC_FLIGHT_H
#define WEND_SRC_FLIGHT_H

#include "halo.h"

/** One message to and one from a peer; none where the count is 0. */
typedef struct wend_post {
  const void *send;
  void *recv;
  int send_count, recv_count;
  MPI_Request sending, receiving;
} wend_post;

/** Starts all messages, post[k] with peer[k]; completes them. Collective among peers, allocate
 * nothing; a failure is recorded and returned. */
wend_status wend_post_begin(wend_team *team, int peers, const int *peer, wend_post *post,
                            MPI_Datatype type);
wend_status wend_post_end(wend_team *team, int peers, wend_post *post);
/** Both in one. */
wend_status wend_post_all(wend_team *team, int peers, const int *peer, wend_post *post,
                          MPI_Datatype type);

/** Makes what exchanges with so many peers need, buffers apart. Local; NULL and a recorded
 * failure where there is no memory. */
void *wend_flight_make(wend_team *team, int peers);
/** Frees it; NULL is fine. Local. */
void wend_flight_free(void *flight);

#endif
