/* SPDX-License-Identifier: LGPL-3.0-or-later
 * setup_keys.c: every key of a setup, its default and its meaning, each said once. */
#include "setup_keys.h"
#include "box.h"
#include "setup.h"
#include "smoothing.h"
#include "supertime.h"
#include <math.h>
#include <string.h>

static const char *smoothing_name(int k) {
  const wend_smoothing *row = wend_smoothing_at(k);
  return row != NULL ? row->name : NULL;
}

static const char *scheme_name(int k) {
  const wend_supertime *row = wend_supertime_at(k);
  return row != NULL ? row->name : NULL;
}

static const char *boundary_name(int k) {
  return k < WEND_BOUNDARIES ? wend_boundary_name((wend_boundary)k) : NULL;
}

static const char *unmagnetised_name(int k) {
  static const char *const names[] = {"isotropic", "none"};
  return k < 2 ? names[k] : NULL;
}

#define AT(member) .offset = offsetof(wend_setup, member)
#define TEXT .kind = WEND_KEY_TEXT
#define NAME .kind = WEND_KEY_NAME
#define SWITCH .kind = WEND_KEY_SWITCH
#define ELSEWHERE .offset = WEND_KEY_ELSEWHERE
#define COUNT(low, high) .kind = WEND_KEY_COUNT, .least = (low), .most = (high)
#define NUMBER(low, high) .kind = WEND_KEY_QUANTITY, .least = (low), .most = (high)
#define QUANTITY(what)                                                                         \
  .kind = WEND_KEY_QUANTITY, .quantity = (what), .least = -INFINITY, .most = INFINITY
#define AMOUNT(what) .kind = WEND_KEY_QUANTITY, .quantity = (what), .most = INFINITY
#define SIZE(what) QUANTITY(what), .positive = true
#define LIST(what) .kind = WEND_KEY_LIST, .quantity = (what), ELSEWHERE
#define NAMES .kind = WEND_KEY_NAMES, ELSEWHERE

/* A coefficient of each particle: a value, a record, or a power law. */
#define LAW(where, law, record)                                                                \
  {"diffusion." where,                                                                         \
   .kind = WEND_KEY_LAW,                                                                       \
   .quantity = WEND_Q_DIFFUSIVITY,                                                             \
   .fallback = "0 cm^2/s",                                                                     \
   ELSEWHERE,                                                                                  \
   .meaning = "short form: a value, or the word record; else a group of the keys below"},      \
      {"diffusion." where ".constant", AMOUNT(WEND_Q_DIFFUSIVITY), .fallback = "(none)",       \
       AT(law.value), .meaning = "the same value everywhere"},                                 \
      {"diffusion." where ".record", SWITCH, .fallback = "no", ELSEWHERE,                      \
       .meaning = "yes: record " record " of the particle file"},                              \
      {"diffusion." where ".power.at", AMOUNT(WEND_Q_DIFFUSIVITY), .fallback = "(none)",       \
       AT(law.value),                                                                          \
       .meaning = "at (rho / density)^density_index (|B| / field)^field_index"},               \
      {"diffusion." where ".power.density", SIZE(WEND_Q_DENSITY), .fallback = "(none)",        \
       AT(law.density), .meaning = "mass density at which the law equals `at`"},               \
      {"diffusion." where ".power.density_index", NUMBER(-10, 10), .fallback = "0",            \
       AT(law.density_index), .meaning = "power of the density"},                              \
      {"diffusion." where ".power.field", SIZE(WEND_Q_FIELD), .fallback = "(none)",            \
       AT(law.field), .meaning = "magnetic field at which the law equals `at`"},               \
  {                                                                                            \
    "diffusion." where ".power.field_index", NUMBER(-10, 10),                                  \
        .fallback = "0", AT(law.field_index), .meaning = "power of the field"                  \
  }

static const wend_key keys[] = {
    {"particles", TEXT, .fallback = "(required)", AT(particles),
     .meaning = "particle file to start from, openPMD in HDF5"},
    {"iteration", COUNT(0, 2147483647), .fallback = "(the last)", AT(iteration),
     .meaning = "iteration of the particle file, where it holds several"},

    {"output.folder", TEXT, .fallback = "out", AT(folder),
     .meaning = "where outputs go; made if it is missing"},
    {"output.name", TEXT, .fallback = "run", AT(name),
     .meaning = "outputs are called NAME_<n>.h5"},
    {"output.every", SIZE(WEND_Q_TIME), .fallback = "(only the end)", AT(every),
     .meaning = "time between outputs, counted from the start"},
    {"output.times", LIST(WEND_Q_TIME), .fallback = "(none)",
     .meaning = "further output times"},
    {"output.checkpoint_every_steps", COUNT(1, 2147483647), .fallback = "(none)",
     AT(checkpoint_steps), .meaning = "super-steps between checkpoints"},

    {"time.start", QUANTITY(WEND_Q_TIME), .fallback = "(time of the particle file)", AT(start),
     .meaning = "time at the start"},
    {"time.end", QUANTITY(WEND_Q_TIME), .fallback = "(required)", AT(end),
     .meaning = "time at the end"},
    {"time.steps", COUNT(1, 2147483647), .fallback = "(no limit)", AT(steps),
     .meaning = "stop after so many super-steps"},

    {"units.length", SIZE(WEND_Q_LENGTH), .fallback = "1 kpc", AT(units.length),
     .meaning = "unit of length to compute in"},
    {"units.time", SIZE(WEND_Q_TIME), .fallback = "1 Myr", AT(units.time),
     .meaning = "unit of time to compute in"},
    {"units.mass", SIZE(WEND_Q_MASS), .fallback = "1 Msun", AT(units.mass),
     .meaning = "unit of mass to compute in"},

    {"domain.dimension", COUNT(2, 3), .fallback = "(entries of domain.lower)", AT(domain.dim),
     .meaning = "dimension of the run"},
    {"domain.lower", LIST(WEND_Q_LENGTH), .fallback = "(box of the particle file)",
     .meaning = "lower corner of the box"},
    {"domain.upper", LIST(WEND_Q_LENGTH), .fallback = "(box of the particle file)",
     .meaning = "upper corner of the box"},
    {"domain.boundaries", NAMES, .fallback = "(periodic on every axis)", .names = boundary_name,
     .meaning = "boundary of each axis"},
    {"domain.thickness", SIZE(WEND_Q_LENGTH), .fallback = "(one unit of length)",
     AT(domain.thickness), .meaning = "depth of a 2-D run along the third axis"},

    LAW("parallel", kappa_par, "parallelDiffusivity"),
    LAW("perpendicular", kappa_perp, "perpendicularDiffusivity"),
    {"diffusion.unmagnetised", NAME, .fallback = "isotropic", ELSEWHERE,
     .names = unmagnetised_name,
     .meaning = "where B = 0: diffusivity (parallel + 2 perpendicular) / 3 in all directions, "
                "or none"},

    {"streaming.length", SIZE(WEND_Q_LENGTH), .fallback = "(no streaming)",
     AT(settings.streaming_length),
     .meaning =
         "regularisation length of Alfvenic streaming: full streaming where |e/g| is below"},
    {"streaming.supports", NUMBER(0, 1e6), .fallback = "(no streaming)",
     AT(settings.streaming_supports),
     .meaning =
         "the same in support radii of each particle; one of the two turns streaming on"},
    {"streaming.alfven_ceiling", SIZE(WEND_Q_SPEED), .fallback = "(none)",
     AT(settings.alfven_ceiling),
     .meaning = "Alfven speed at most; how often it is used is counted"},

    {"geometry.smoothing", NAME, AT(settings.smoothing), .names = smoothing_name,
     .meaning = "smoothing kernel"},
    {"geometry.neighbours", NUMBER(6, 1000), .fallback = "(22 in 2-D, 48 in 3-D)",
     AT(settings.neighbours),
     .meaning = "neighbours within the support, the particle itself included"},
    {"geometry.closure", NUMBER(0, 1), .positive = true, AT(settings.closure),
     .meaning = "faces are swept until sum_j A_ij is below this share of sum_j |A_ij|"},
    {"geometry.sweeps", COUNT(1, 10000), AT(settings.sweeps), .meaning = "sweeps at most"},
    {"geometry.close_faces", SWITCH, AT(settings.close_faces),
     .meaning = "ask for sum_j A_ij = 0; no only to see what it is worth"},
    {"geometry.fix_volumes", SWITCH, AT(settings.fix_volumes),
     .meaning = "ask for sum_j A_ij.r_ij = 2 D V_i; no only to see what it is worth"},

    {"exchange.angle_power", NUMBER(0, 64), AT(settings.angle_power),
     .meaning = "power of the squared cosine between pair and field in the low-order exchange"},
    {"exchange.angle_share", NUMBER(0, 1), AT(settings.angle_share),
     .meaning = "share of the low-order exchange that is kept along the field"},
    {"exchange.sharpen", SWITCH, AT(settings.sharpen),
     .meaning = "undo the second-order smoothing of slopes and faces (never beside streaming)"},

    {"stepping.scheme", NAME, AT(settings.supertime), .names = scheme_name,
     .meaning = "super-time-stepping family"},
    {"stepping.stages", COUNT(1, WEND_STAGES_MOST), AT(settings.stages),
     .meaning = "stages a super-step at most, an odd number"},
    {"stepping.margin", NUMBER(0, 1), .positive = true, AT(settings.margin),
     .meaning = "share of the stable length that is used"},
    {"stepping.tolerance", NUMBER(0, 1), .positive = true, AT(settings.tolerance),
     .meaning = "error a super-step, summed over volume, over the total energy"},
    {"stepping.first", SIZE(WEND_Q_TIME), .fallback = "(one explicit step)",
     AT(settings.first_step), .meaning = "length of the first super-step"},
    {"stepping.fixed", SIZE(WEND_Q_TIME), .fallback = "(lengths from the tolerance)",
     AT(settings.fixed_step), .meaning = "length of every super-step, without error control"},
    {"stepping.local_bounds", SWITCH, AT(settings.local_bounds),
     .meaning = "also test each particle against the range of its neighbourhood (costs time)"},
};

const wend_key *wend_key_at(int k) { return k >= 0 && k < wend_key_count() ? &keys[k] : NULL; }

int wend_key_count(void) { return (int)(sizeof keys / sizeof keys[0]); }

int wend_key_find(const char *path) {
  for (int k = 0; k < wend_key_count(); k++)
    if (strcmp(keys[k].path, path) == 0) return k;
  return -1;
}

const char *wend_key_fallback(const wend_key *key) {
  return key->fallback != NULL && key->fallback[0] != '(' ? key->fallback : NULL;
}

/* The default as people read it; where the row has none it is the library's. */
static void default_text(const wend_key *key, size_t size, char *text) {
  const wend_setup library = {.settings = wend_settings_default()};
  const char *value = (const char *)&library + key->offset;
  if (key->fallback != NULL)
    snprintf(text, size, "%s", key->fallback);
  else if (key->kind == WEND_KEY_NAME)
    snprintf(text, size, "%s", *(const char *const *)value);
  else if (key->kind == WEND_KEY_SWITCH)
    snprintf(text, size, "%s", *(const bool *)value ? "yes" : "no");
  else if (key->kind == WEND_KEY_COUNT)
    snprintf(text, size, "%d", *(const int *)value);
  else
    snprintf(text, size, "%g", *(const double *)value);
}

/* What a value looks like, in a word or two. */
static const char *value_of(const wend_key *key) {
  switch (key->kind) {
  case WEND_KEY_TEXT:
    return "text";
  case WEND_KEY_NAME:
    return "a name";
  case WEND_KEY_SWITCH:
    return "yes or no";
  case WEND_KEY_COUNT:
    return "a whole number";
  case WEND_KEY_QUANTITY:
  case WEND_KEY_LAW:
    return wend_quantity_find(key->quantity)->name;
  case WEND_KEY_LIST:
    return "a list of quantities";
  case WEND_KEY_NAMES:
    return "a list of names";
  }
  return "";
}

void wend_setup_explain(FILE *out) {
  fprintf(out, "%-44s %-20s %-28s %s\n", "key", "value", "default", "meaning");
  for (int k = 0; k < wend_key_count(); k++) {
    const wend_key *key = &keys[k];
    char fallback[64];
    default_text(key, sizeof fallback, fallback);
    fprintf(out, "%-44s %-20s %-28s %s", key->path, value_of(key), fallback, key->meaning);
    for (int n = 0; key->names != NULL && key->names(n) != NULL; n++)
      fprintf(out, "%s%s", n == 0 ? ": " : ", ", key->names(n));
    fprintf(out, "\n");
  }
}
