/* SPDX-License-Identifier: LGPL-3.0-or-later
 * halo_exchange.c: fills the ghosts of a field, in messages that compute can overlap.
 *
 * Fields without gaps are received in place, others through a buffer. Where a buffer cannot
 * grow the messages still go out (with the start of the field for content), so that no peer
 * waits for ever; the failure is recorded and reaches all ranks at the next agreement. */
#include "flight.h"
#include <stdlib.h>
#include <string.h>

enum { WIDEST = 64, SIZES = 2 };

typedef struct buffer {
  char *data;
  size_t room; /* bytes */
} buffer;

typedef struct flight {
  wend_post *post; /* [peers] */
  buffer send, recv;
  MPI_Datatype item[SIZES]
                   [WIDEST + 1]; /* made when first met; counts of items never overflow */
  bool under_way, unpack;
  char *field;
  size_t step, payload; /* bytes from item to item, and of them sent */
} flight;

void *wend_flight_make(wend_team *team, int peers) {
  flight *f = wend_allocate(team, 1, sizeof *f);
  if (f == NULL) return NULL;
  for (int s = 0; s < SIZES; s++)
    for (int w = 0; w <= WIDEST; w++) f->item[s][w] = MPI_DATATYPE_NULL;
  f->post = wend_allocate(team, peers, sizeof *f->post);
  return f;
}

void wend_flight_free(void *flight_of_halo) {
  flight *f = flight_of_halo;
  if (f == NULL) return;
  for (int s = 0; s < SIZES; s++)
    for (int w = 0; w <= WIDEST; w++)
      if (f->item[s][w] != MPI_DATATYPE_NULL) MPI_Type_free(&f->item[s][w]);
  free(f->post);
  free(f->send.data);
  free(f->recv.data);
  free(f);
}

static bool reserve(wend_team *team, buffer *b, size_t room) {
  if (room <= b->room) return true;
  free(b->data);
  b->data = wend_allocate(team, (int64_t)room, 1);
  b->room = b->data != NULL ? room : 0;
  return b->data != NULL;
}

static wend_status check(wend_team *team, const wend_halo *halo, int stride, int width,
                         int size) {
  const flight *f = halo->flight;
  if (f == NULL)
    return wend_fail(team, WEND_ERR_ARGUMENT, "a halo was used before it was built");
  if (f->under_way)
    return wend_fail(team, WEND_ERR_ARGUMENT,
                     "an exchange of ghosts is under way already: end it before the next");
  if ((size != 4 && size != 8) || width < 1 || width > WIDEST || stride < width)
    return wend_fail(
        team, WEND_ERR_ARGUMENT,
        "ghosts cannot be exchanged with %d of %d values an item, %d bytes each: at "
        "most %d, of 4 or 8 bytes",
        width, stride, size, WIDEST);
  return WEND_OK;
}

static MPI_Datatype item_type(wend_team *team, flight *f, int width, int size) {
  MPI_Datatype *const type = &f->item[size == 8][width];
  if (*type != MPI_DATATYPE_NULL) return *type;
  if (MPI_Type_contiguous(width, size == 8 ? MPI_UINT64_T : MPI_UINT32_T, type) !=
          MPI_SUCCESS ||
      MPI_Type_commit(type) != MPI_SUCCESS)
    wend_fail(team, WEND_ERR_MPI, "the message layer refused a type of %d values", width);
  return *type;
}

/* Copies n items of the field, item where[k] for each k, one behind the other. */
static void pack(const flight *f, int32_t n, const int32_t *where) {
  const size_t bytes = f->payload;
  char *out = f->send.data;
  if (bytes == 8) { /* the width met most: one load and store an item */
    for (int32_t k = 0; k < n; k++)
      memcpy(out + (size_t)k * 8, f->field + (size_t)where[k] * f->step, 8);
    return;
  }
  for (int32_t k = 0; k < n; k++)
    memcpy(out + (size_t)k * bytes, f->field + (size_t)where[k] * f->step, bytes);
}

static void unpack(const flight *f, int32_t owned, int32_t n) {
  char *const out = f->field + (size_t)owned * f->step;
  for (int32_t g = 0; g < n; g++)
    memcpy(out + (size_t)g * f->step, f->recv.data + (size_t)g * f->payload, f->payload);
}

/* Where each message starts and ends up. */
static void address(const wend_halo *halo, flight *f, bool packed) {
  char *const ghosts = f->field + (size_t)halo->owned * f->step;
  for (int p = 0; p < halo->peers; p++) {
    const size_t sent = (size_t)halo->send_first[p], seen = (size_t)halo->recv_first[p];
    f->post[p] = (wend_post){.send = packed ? f->send.data + sent * f->payload : f->field,
                             .recv = f->unpack ? f->recv.data + seen * f->payload
                                               : ghosts + seen * f->step,
                             .send_count = halo->send_first[p + 1] - halo->send_first[p],
                             .recv_count = halo->recv_first[p + 1] - halo->recv_first[p]};
  }
}

static void account(wend_halo *halo, size_t payload) {
  for (int p = 0; p < halo->peers; p++) {
    const int64_t items = halo->send_first[p + 1] - halo->send_first[p];
    halo->messages += items > 0;
    halo->bytes += items * (int64_t)payload;
  }
}

static void start(wend_team *team, wend_halo *halo, void *field, int stride, int width,
                  int size) {
  flight *const f = halo->flight;
  f->under_way = true;
  if (halo->peers == 0) return;
  const int32_t sent = halo->send_first[halo->peers];
  f->field = field;
  f->step = (size_t)stride * (size_t)size;
  f->payload = (size_t)width * (size_t)size;
  f->unpack = stride != width && reserve(team, &f->recv, (size_t)halo->ghosts * f->payload);
  const bool packed = reserve(team, &f->send, (size_t)sent * f->payload);
  if (packed) pack(f, sent, halo->send_list);
  address(halo, f, packed);
  account(halo, f->payload);
  wend_post_begin(team, halo->peers, halo->peer, f->post, item_type(team, f, width, size));
}

wend_status wend_halo_begin(wend_team *team, wend_halo *halo, void *field, int stride,
                            int width, int size) {
  const wend_status status = check(team, halo, stride, width, size);
  if (status != WEND_OK) return status;
  start(team, halo, field, stride, width, size);
  return team->status;
}

wend_status wend_halo_end(wend_team *team, wend_halo *halo) {
  flight *const f = halo->flight;
  if (f == NULL || !f->under_way)
    return wend_fail(team, WEND_ERR_ARGUMENT, "no exchange of ghosts is under way");
  wend_post_end(team, halo->peers, f->post);
  if (halo->peers > 0 && f->unpack) unpack(f, halo->owned, halo->ghosts);
  f->under_way = false;
  return team->status;
}

wend_status wend_halo_exchange(wend_team *team, wend_halo *halo, void *field, int stride,
                               int width, int size) {
  const wend_status status = check(team, halo, stride, width, size);
  if (status != WEND_OK) return status;
  start(team, halo, field, stride, width, size);
  return wend_halo_end(team, halo);
}

void wend_halo_reset(wend_halo *halo) {
  wend_flight_free(halo->flight);
  free(halo->peer);
  free(halo->send_first);
  free(halo->send_list);
  free(halo->recv_first);
  memset(halo, 0, sizeof *halo);
}
