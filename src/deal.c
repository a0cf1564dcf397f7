/* SPDX-License-Identifier: LGPL-3.0-or-later
 * deal.c: deals columns of 8-byte values out to ranks. */
#include "deal.h"
#include <stdlib.h>
#include <string.h>

wend_status wend_deal_init(wend_team *team, wend_deal *deal) {
  memset(deal, 0, sizeof *deal);
  deal->send_count = wend_allocate(team, team->size, sizeof(int));
  deal->send_first = wend_allocate(team, team->size, sizeof(int));
  deal->recv_count = wend_allocate(team, team->size, sizeof(int));
  deal->recv_first = wend_allocate(team, team->size, sizeof(int));
  return wend_agree(team);
}

wend_status wend_deal_begin(wend_team *team, wend_deal *deal) {
  if (MPI_Alltoall(deal->send_count, 1, MPI_INT, deal->recv_count, 1, MPI_INT, team->comm) !=
      MPI_SUCCESS)
    wend_fail(team, WEND_ERR_MPI, "ranks could not exchange counts of particles");
  int64_t sent = 0, received = 0;
  for (int r = 0; r < team->size; r++) {
    deal->send_first[r] = (int)sent;
    sent += deal->send_count[r];
    deal->recv_first[r] = received <= INT32_MAX ? (int)received : 0;
    received += deal->recv_count[r];
  }
  if (received > INT32_MAX)
    wend_fail(team, WEND_ERR_PARTICLES,
              "rank %d would own %lld particles, more than %d: use more ranks", team->rank,
              (long long)received, INT32_MAX);
  deal->received = (int32_t)received;
  return wend_agree(team);
}

wend_status wend_deal_column(wend_team *team, const wend_deal *deal, const void *send,
                             void *recv) {
  if (MPI_Alltoallv(send, deal->send_count, deal->send_first, MPI_UINT64_T, recv,
                    deal->recv_count, deal->recv_first, MPI_UINT64_T,
                    team->comm) != MPI_SUCCESS)
    wend_fail(team, WEND_ERR_MPI, "ranks could not exchange particles");
  return team->status;
}

void wend_deal_reset(wend_deal *deal) {
  free(deal->send_count);
  free(deal->send_first);
  free(deal->recv_count);
  free(deal->recv_first);
  memset(deal, 0, sizeof *deal);
}
