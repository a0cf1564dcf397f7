/* SPDX-License-Identifier: LGPL-3.0-or-later
 * setup.c: what a run is asked to do, read from a YAML file.
 *
 * Rank 0 reads the text; every rank then understands it on its own, and so comes to the same
 * setup. */
#include "setup.h"
#include "setup_keys.h"
#include "setup_values.h"
#include "supertime.h"
#include <errno.h>
#include <stdlib.h>
#include <string.h>

enum { BYTES_MOST = 1 << 20 }; /* a setup is a page; a larger file is something else */

static char *read_whole(wend_team *team, const char *path) {
  FILE *file = fopen(path, "rb");
  if (file == NULL) {
    wend_fail(team, WEND_ERR_FILE, "setup %s cannot be opened: %s", path, strerror(errno));
    return NULL;
  }
  char *text = wend_allocate(team, BYTES_MOST + 1, 1);
  const size_t length = text != NULL ? fread(text, 1, BYTES_MOST, file) : 0;
  if (ferror(file))
    wend_fail(team, WEND_ERR_FILE, "setup %s cannot be read: %s", path, strerror(errno));
  else if (length == BYTES_MOST)
    wend_fail(team, WEND_ERR_FILE, "setup %s is larger than a setup can be (1 MB)", path);
  else if (text != NULL && memchr(text, '\0', length) != NULL)
    wend_fail(team, WEND_ERR_FILE, "setup %s is no text file", path);
  fclose(file);
  if (team->status == WEND_OK) return text;
  free(text);
  return NULL;
}

/* The whole text on every rank. Collective. */
static wend_status share_text(wend_team *team, const char *path, char **text) {
  wend_status status;
  char *mine = team->rank == 0 ? read_whole(team, path) : NULL;
  WEND_TRY(wend_agree(team));
  int length = mine != NULL ? (int)strlen(mine) : 0;
  if (MPI_Bcast(&length, 1, MPI_INT, 0, team->comm) != MPI_SUCCESS)
    wend_fail(team, WEND_ERR_MPI, "setup %s could not be sent to all ranks", path);
  if (mine == NULL) mine = wend_allocate(team, (int64_t)length + 1, 1);
  WEND_TRY(wend_agree(team));
  if (MPI_Bcast(mine, length, MPI_CHAR, 0, team->comm) != MPI_SUCCESS)
    wend_fail(team, WEND_ERR_MPI, "setup %s could not be sent to all ranks", path);
  WEND_TRY(wend_agree(team));
  *text = mine;
  mine = NULL;
done:
  free(mine);
  return status;
}

static int ascending(const void *a, const void *b) {
  const double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

static void understand_times(wend_setup_reader *reader) {
  wend_setup *setup = reader->setup;
  const wend_yaml_value *list = &reader->value[wend_key_find("output.times")];
  setup->times = wend_allocate(reader->team, list->items, sizeof *setup->times);
  for (uint32_t k = 0; k < list->items && reader->team->status == WEND_OK; k++) {
    setup->times[k] = wend_setup_quantity(reader, "output.times", list->item[k]);
    if (setup->times[k] > setup->end || (setup->start_given && setup->times[k] < setup->start))
      wend_setup_fail(reader, "output.times", "\"%s\" lies outside the run", list->item[k]);
  }
  if (reader->team->status != WEND_OK) return;
  setup->n_times = (int)list->items;
  if (list->items > 0) qsort(setup->times, list->items, sizeof *setup->times, ascending);
}

/* What single keys cannot know. */
static void check_together(wend_setup_reader *reader) {
  wend_setup *setup = reader->setup;
  setup->start_given = wend_setup_given(reader, "time.start");
  if (setup->start_given && !(setup->end > setup->start))
    wend_setup_fail(reader, "time.end", "is not after time.start");
  if (strpbrk(setup->name, "/%") != NULL)
    wend_setup_fail(reader, "output.name",
                    "\"%s\" must not hold / or %%: folders go to output.folder", setup->name);
  const wend_supertime *scheme = wend_supertime_find(setup->settings.supertime);
  const bool stages_given = wend_setup_given(reader, "stepping.stages");
  const int stages = setup->settings.stages;
  if (scheme->most == 1 && !stages_given)
    setup->settings.stages = 1;
  else if (stages < scheme->least || stages > scheme->most)
    wend_setup_fail(reader, "stepping.stages", "%d: %s takes %d to %d stages", stages,
                    scheme->name, scheme->least, scheme->most);
  else if (stages % 2 == 0)
    wend_setup_fail(reader, "stepping.stages",
                    "%d is even: only odd numbers damp at the stability limit", stages);
  if (wend_setup_given(reader, "stepping.fixed") && wend_setup_given(reader, "stepping.first"))
    wend_setup_fail(reader, "stepping.first", "has no meaning beside stepping.fixed");
  if (wend_setup_given(reader, "streaming.length") &&
      wend_setup_given(reader, "streaming.supports"))
    wend_setup_fail(reader, "streaming.supports", "has no meaning beside streaming.length");
}

/* Goes on to the next step as long as the ones before went well. Local. */
static void understand(wend_setup_reader *reader) {
  static void (*const step[])(wend_setup_reader *) = {wend_setup_store, check_together,
                                                      understand_times, wend_setup_domain,
                                                      wend_setup_diffusion};
  wend_team *team = reader->team;
  wend_setup *setup = reader->setup;
  wend_yaml_scan(team, setup->path, setup->text, &reader->places);
  if (team->status == WEND_OK)
    wend_yaml_load(team, setup->path, setup->text, &reader->places, &reader->value);
  wend_unit_names *names = team->status == WEND_OK ? wend_unit_names_create(team) : NULL;
  reader->names = names;
  for (size_t k = 0; k < sizeof step / sizeof step[0] && team->status == WEND_OK; k++)
    step[k](reader);
  wend_unit_names_destroy(names);
  wend_yaml_values_free(reader->value);
  wend_yaml_places_reset(&reader->places);
}

wend_status wend_setup_read(wend_team *team, const char *path, wend_setup *setup) {
  wend_status status;
  *setup = (wend_setup){.iteration = -1, .settings = wend_settings_default()};
  WEND_TRY(share_text(team, path, &setup->text));
  setup->path = wend_allocate(team, (int64_t)strlen(path) + 1, 1);
  if (setup->path != NULL) {
    strcpy(setup->path, path);
    wend_setup_reader reader = {.team = team, .setup = setup};
    understand(&reader);
  }
  WEND_TRY(wend_agree(team));
done:
  if (status != WEND_OK) wend_setup_reset(setup);
  return status;
}

void wend_setup_reset(wend_setup *setup) {
  free(setup->path);
  free(setup->text);
  free(setup->particles);
  free(setup->folder);
  free(setup->name);
  free(setup->times);
  memset(setup, 0, sizeof *setup);
}

/* FNV-1a, 64 bits: offset basis and prime of Fowler, Noll & Vo (RFC 9923). */
uint64_t wend_setup_hash(const wend_setup *setup) {
  uint64_t hash = 0xcbf29ce484222325u;
  for (const char *c = setup->text; c != NULL && *c != '\0'; c++)
    hash = (hash ^ (unsigned char)*c) * 0x100000001b3u;
  return hash;
}
