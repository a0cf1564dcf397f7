/* SPDX-License-Identifier: LGPL-3.0-or-later
 * halo.h: one layer of ghosts, and the exchange of their fields.
 *
 * A ghost is a particle of another rank with r_ij < max(H_i, H_j) for some owned i. Fields are
 * stored owned first, then ghosts grouped by source rank in ascending rank, canonical order
 * within. */
#ifndef WEND_SRC_HALO_H
#define WEND_SRC_HALO_H

#include "domain.h"
#include "team.h"
#include <stdint.h>

typedef struct wend_halo {
  int32_t owned;       /**< particles of this rank */
  int32_t ghosts;      /**< particles of others that this rank sees */
  int peers;           /**< ranks this one exchanges with */
  int *peer;           /**< [peers] their ranks, ascending */
  int32_t *send_first; /**< [peers + 1] into send_list */
  int32_t *send_list;  /**< owned indices to send, canonical order within a peer */
  int32_t *recv_first; /**< [peers + 1] first ghost of each peer, counted from 0 */
  void *flight;        /**< requests and buffers of an exchange under way; private */
  int64_t messages;    /**< messages sent since the halo was built */
  int64_t bytes;       /**< payload bytes sent since the halo was built */
} wend_halo;

/** Finds the ghosts of owned particles. Collective.
 *
 * place [owned][4]: x, y, z, H of this rank's particles in canonical order. The result may
 * hold more ghosts than pairs need (boxes are used); wend_halo_trim drops the rest. Owned
 * particles must keep their order while the halo lives; the decomposition may be any (a rank
 * may be empty, or own everything). The same status on all ranks: WEND_ERR_PARTICLES where a
 * place is not finite or a support is negative; the halo is then empty. */
wend_status wend_halo_build(wend_team *team, const wend_domain *domain, int32_t owned,
                            const double (*place)[4], wend_halo *halo);

/** Keeps only the ghosts with used[g] true, g in [0, ghosts), on both sides. Collective.
 * renumber [ghosts] receives the new ghost number of each kept ghost, -1 of a dropped one. */
wend_status wend_halo_trim(wend_team *team, wend_halo *halo, const bool *used,
                           int32_t *renumber);

/** Starts to fill the ghosts of a field: item i is `width` consecutive values at field + i *
 * stride * size, `size` bytes each value (8 for double and uint64_t, 4 for float and int32_t),
 * at most 64 of them. Items [0, owned) are read at once and may change after the call, items
 * [owned, owned + ghosts) are written by the time `end` returns; what lies between items is not
 * touched. One exchange at a time. Collective among peers, who never wait for ever for a rank
 * that is out of memory: a failure is recorded for the next agreement, and returned. */
wend_status wend_halo_begin(wend_team *team, wend_halo *halo, void *field, int stride,
                            int width, int size);
/** Waits for the exchange under way. */
wend_status wend_halo_end(wend_team *team, wend_halo *halo);
/** begin and end in one. */
wend_status wend_halo_exchange(wend_team *team, wend_halo *halo, void *field, int stride,
                               int width, int size);

/** Frees the halo and zeroes the struct. Local. */
void wend_halo_reset(wend_halo *halo);

#endif
