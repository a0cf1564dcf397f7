/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_setup.c: what setups mean, and that each mistake is named by file, line and key. */
#include "scratch.h"
#include "setup.h"
#include "setup_keys.h"
#include "spread.h"

#include <check.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

static wend_team team;

static wend_status read_text(const char *text, wend_setup *setup) {
  scratch_write("setup.yaml", strlen(text), text);
  return wend_setup_read(&team, scratch_path("setup.yaml"), setup);
}

#define HEAD "particles: ring.h5\ntime: {end: 200 Myr}\n"

static const char whole[] =
    "# every key at once\n"
    "particles: some/ring.h5\n"
    "iteration: 12\n"
    "output:\n"
    "  folder: results\n"
    "  name: ring-1\n"
    "  every: 10 Myr\n"
    "  times: [7 Myr, 3 Myr, 0.0055 Gyr]\n"
    "  checkpoint_every_steps: 50\n"
    "time:\n"
    "  start: 1 Myr\n"
    "  end: 0.2 Gyr\n"
    "  steps: 1000\n"
    "units: {length: 10 pc, time: 1 kyr, mass: 1e30 kg}\n"
    "domain:\n"
    "  dimension: 2\n"
    "  lower: [-1 kpc, 0]\n"
    "  upper: [1 kpc, 300 pc]\n"
    "  boundaries: [periodic, open]\n"
    "  thickness: 20 pc\n"
    "diffusion:\n"
    "  parallel:\n"
    "    power: {at: 3e28 cm^2/s, density: 1e-24 g/cm^3, density_index: -0.5,\n"
    "            field: 5 uG, field_index: -1}\n"
    "  perpendicular: {record: yes}\n"
    "  unmagnetised: none\n"
    "geometry:\n"
    "  smoothing: cubic-spline\n"
    "  neighbours: 33.5\n"
    "  closure: 1e-4\n"
    "  sweeps: 64\n"
    "  close_faces: no\n"
    "  fix_volumes: off\n"
    "exchange: {angle_power: 8, angle_share: 1}\n"
    "stepping:\n"
    "  scheme: rkl2\n"
    "  stages: 9\n"
    "  margin: 0.9\n"
    "  tolerance: 1e-5\n"
    "  first: 2 yr\n"
    "  local_bounds: true\n";

#define CLOSE(a, b)                                                                            \
  ck_assert_double_eq_tol((a) / (b), 1, 4e-15) /* some conversions' roundings */

static void check_whole_values(const wend_setup *s) {
  const wend_settings *n = &s->settings;
  ck_assert_str_eq(s->particles, "some/ring.h5");
  ck_assert_int_eq(s->iteration, 12);
  ck_assert_str_eq(s->folder, "results");
  ck_assert_str_eq(s->name, "ring-1");
  CLOSE(s->every, 10e3);
  ck_assert_int_eq(s->n_times, 3);
  CLOSE(s->times[0], 3e3); /* sorted */
  CLOSE(s->times[1], 5.5e3);
  CLOSE(s->times[2], 7e3);
  ck_assert_int_eq(s->checkpoint_steps, 50);
  ck_assert(s->start_given);
  CLOSE(s->start, 1e3);
  CLOSE(s->end, 200e3);
  ck_assert_int_eq(s->steps, 1000);
  CLOSE(s->units.length, 3.0856775814913673e17);
  CLOSE(s->units.time, 31557600e3);
  CLOSE(s->units.mass, 1e30);
  ck_assert_str_eq(n->smoothing, "cubic-spline");
  ck_assert_double_eq(n->neighbours, 33.5);
  ck_assert_double_eq(n->closure, 1e-4);
  ck_assert_int_eq(n->sweeps, 64);
  ck_assert(!n->close_faces && !n->fix_volumes && n->local_bounds &&
            !n->isotropic_unmagnetised);
  ck_assert_double_eq(n->angle_power, 8);
  ck_assert_double_eq(n->angle_share, 1);
  ck_assert_str_eq(n->supertime, "rkl2");
  ck_assert_int_eq(n->stages, 9);
  ck_assert_double_eq(n->margin, 0.9);
  ck_assert_double_eq(n->tolerance, 1e-5);
  CLOSE(n->first_step, 2e-3);
}

START_TEST(every_key_is_understood) {
  wend_setup s;
  const wend_status status = read_text(whole, &s);
  ck_assert_msg(status == WEND_OK, "%s", team.text);
  check_whole_values(&s);
  const wend_domain *d = &s.domain;
  ck_assert(s.domain_given && d->dim == 2 && !d->open[0] && d->open[1]);
  CLOSE(d->lo[0], -100);
  CLOSE(d->hi[0], 100);
  CLOSE(d->hi[1], 30);
  ck_assert(d->lo[1] == 0 && d->period[0] == d->hi[0] - d->lo[0] && d->period[1] == 0);
  ck_assert(d->half[0] == d->period[0] / 2 && isinf(d->half[1]) && d->lo[2] == 0 &&
            d->hi[2] == 0);
  CLOSE(d->thickness, 2);
  ck_assert_int_eq(s.kappa_perp.kind, WEND_LAW_RECORD);
  ck_assert_int_eq(s.kappa_par.kind, WEND_LAW_POWER);
  CLOSE(s.kappa_par.value, 3e24 / (3.0856775814913673e17 * 3.0856775814913673e17) * 31557600e3);
  CLOSE(s.kappa_par.density, 1e-21 / 1e30 * pow(3.0856775814913673e17, 3));
  CLOSE(s.kappa_par.field, 5e-10 / (sqrt(1e-7 * 1e30 / 3.0856775814913673e17) / 31557600e3));
  ck_assert_double_eq(s.kappa_par.density_index, -0.5);
  ck_assert_double_eq(s.kappa_par.field_index, -1);
  ck_assert_str_eq(s.text, whole);
  wend_setup_reset(&s);
  ck_assert_ptr_null(s.text);
}
END_TEST

/* What is left out is the library's choice. */
START_TEST(defaults_are_those_of_the_library) {
  wend_setup s;
  const wend_settings d = wend_settings_default();
  ck_assert_msg(read_text(HEAD, &s) == WEND_OK, "%s", team.text);
  const wend_settings *n = &s.settings;
  ck_assert_str_eq(n->smoothing, d.smoothing);
  ck_assert_str_eq(n->supertime, d.supertime);
  ck_assert_double_eq(n->neighbours, d.neighbours);
  ck_assert_double_eq(n->closure, d.closure);
  ck_assert_double_eq(n->angle_power, d.angle_power);
  ck_assert_double_eq(n->angle_share, d.angle_share);
  ck_assert_double_eq(n->margin, d.margin);
  ck_assert_double_eq(n->tolerance, d.tolerance);
  ck_assert_double_eq(n->first_step, d.first_step);
  ck_assert_double_eq(n->fixed_step, d.fixed_step);
  ck_assert_int_eq(n->sweeps, d.sweeps);
  ck_assert_int_eq(n->stages, d.stages);
  ck_assert(n->close_faces == d.close_faces && n->fix_volumes == d.fix_volumes &&
            n->limited == d.limited);
  ck_assert(n->isotropic_unmagnetised == d.isotropic_unmagnetised &&
            n->local_bounds == d.local_bounds);
  const wend_units units = wend_units_default();
  CLOSE(s.units.length, units.length);
  CLOSE(s.units.time, units.time);
  CLOSE(s.units.mass, units.mass);
  ck_assert_str_eq(s.folder, "out");
  ck_assert_str_eq(s.name, "run");
  ck_assert(!s.domain_given && !s.start_given && s.every == 0 && s.n_times == 0 &&
            s.times == NULL);
  ck_assert(s.checkpoint_steps == 0 && s.steps == 0 && s.iteration == -1 && s.end == 200);
  ck_assert(s.kappa_par.kind == WEND_LAW_CONSTANT && s.kappa_par.value == 0);
  ck_assert(s.kappa_perp.kind == WEND_LAW_CONSTANT && s.kappa_perp.value == 0);
  wend_setup_reset(&s);
}
END_TEST

START_TEST(short_forms_and_plain_boxes) {
  wend_setup s;
  ck_assert_msg(read_text(HEAD "units: {length: 1 m, time: 1 s, mass: 1 kg}\n"
                               "diffusion: {parallel: 2 m^2/s, perpendicular: record}\n"
                               "domain: {lower: [0, 0, 0], upper: [1 m, 2 m, 3 m]}\n",
                          &s) == WEND_OK,
                "%s", team.text);
  ck_assert(s.kappa_par.kind == WEND_LAW_CONSTANT && s.kappa_par.value == 2);
  ck_assert(s.kappa_perp.kind == WEND_LAW_RECORD);
  ck_assert(s.domain.dim == 3 && s.domain.thickness == 1 && s.domain.period[2] == 3);
  wend_setup_reset(&s);
  ck_assert_msg(read_text(HEAD "stepping: {scheme: euler, fixed: 1 Myr}\n", &s) == WEND_OK,
                "%s", team.text);
  ck_assert(s.settings.stages == 1 && s.settings.fixed_step == 1);
  wend_setup_reset(&s);
  ck_assert_msg(read_text("x: &t 5 Myr\n", &s) == WEND_ERR_SETUP, "an unknown key was taken");
  ck_assert_msg(read_text("particles: a\ntime: {end: &t 5 Myr}\noutput: {every: *t}\n", &s) ==
                    WEND_OK,
                "%s", team.text);
  ck_assert_double_eq(s.every, 5);
  wend_setup_reset(&s);
}
END_TEST

/* Each broken setup with words that its error must hold, beside the name of the file. */
static const struct {
  const char *text, *word[3];
} broken[] = {
    {"", {"empty", "particles", "time.end"}},
    {"- a\n- b\n", {"must be a group of keys"}},
    {"just text\n", {"must be a group of keys"}},
    {"particles: [a\n", {"line 2", "no YAML"}},
    {"particles: a\n\tx: 1\n", {"line 2", "no YAML"}},
    {"particles: 'a\ntime:\n", {"no YAML"}},
    {HEAD "---\nparticles: b\n", {"line 3", "second document"}},
    {HEAD "? [a]\n: b\n", {"line 3", "a key must be a word"}},
    {HEAD "output: {every: *nowhere}\n", {"nowhere"}},
    {"time: {end: 1 Myr}\n", {"particles: is missing"}},
    {"particles: a\n", {"time.end: is missing"}},
    {"particles:\ntime: {end: 1 Myr}\n", {"line 1: particles: has no value"}},
    {"particles: ''\ntime: {end: 1 Myr}\n", {"line 1: particles: has no value"}},
    {"particles: a\ntime:\n", {"line 2: time must be a group of keys"}},
    {"particles: a\ntime: 5 Myr\n", {"line 2: time must be a group of keys"}},
    {"particles: {a: b}\ntime: {end: 1 Myr}\n", {"line 1: key particles.a is unknown"}},
    {"particles: [a, b]\ntime: {end: 1 Myr}\n", {"line 1: particles must be a single value"}},
    {HEAD "colour: blue\n",
     {"line 3: key colour is unknown", "particles, iteration, output, time"}},
    {HEAD "output:\n  folder: x\n  evry: 1 Myr\n",
     {"line 5: key output.evry is unknown", "every, times"}},
    {HEAD "Output: {every: 1 Myr}\n", {"line 3: key Output is unknown"}},
    {HEAD "diffusion:\n  parallel:\n    power:\n      att: 1 m^2/s\n",
     {"line 6: key diffusion.parallel.power.att is unknown", "at, density, density_index"}},
    {HEAD "particles: b\n", {"line 3: particles is given twice"}},
    {HEAD "output: {every: 1 Myr}\ngeometry: {sweeps: 3}\noutput: {name: a}\n",
     {"line 5: output is given twice"}},
    {HEAD "output: {times: 3 Myr}\n", {"line 3: output.times must be a list"}},
    {HEAD "output: {times: [[3 Myr]]}\n", {"line 3: output.times must be a single value"}},
    {HEAD "output: {every: 3}\n", {"line 3: output.every", "\"3\" has no unit", "10 Myr"}},
    {HEAD "output: {every: 3 kpc}\n",
     {"line 3: output.every", "\"kpc\" measures something else", "10 Myr"}},
    {HEAD "output: {every: 3 Mry}\n", {"line 3: output.every", "\"Mry\" is unknown", "10 Myr"}},
    {HEAD "output: {every: -3 Myr}\n", {"line 3: output.every", "greater than 0"}},
    {HEAD "output: {every: 0}\n", {"line 3: output.every", "greater than 0"}},
    {HEAD "output: {every: nan Myr}\n", {"line 3: output.every", "finite number"}},
    {HEAD "output: {times: [1 Myr, 300 Myr]}\n",
     {"line 3: output.times", "\"300 Myr\" lies outside the run"}},
    {HEAD "output: {times: [1 Myr, 2]}\n", {"line 3: output.times", "\"2\" has no unit"}},
    {HEAD "output: {name: a/b}\n", {"line 3: output.name", "must not hold /"}},
    {HEAD "output: {checkpoint_every_steps: 0}\n",
     {"line 3: output.checkpoint_every_steps", "less than 1"}},
    {HEAD "output: {checkpoint_every_steps: 2.5}\n", {"line 3", "no whole number"}},
    {HEAD "iteration: -1\n", {"line 3: iteration", "less than 0"}},
    {HEAD "iteration: 99999999999\n", {"line 3: iteration", "more than"}},
    {"particles: a\ntime: {start: 3 Myr, end: 3 Myr}\n",
     {"line 2: time.end", "not after time.start"}},
    {"particles: a\ntime: {end: 3 Myr, steps: x}\n", {"line 2: time.steps", "no whole number"}},
    {HEAD "units: {length: 1}\n", {"line 3: units.length", "has no unit", "1 kpc"}},
    {HEAD "units: {length: 0 kpc}\n", {"line 3: units.length", "greater than 0"}},
    {HEAD "units: {time: 1 kpc}\n", {"line 3: units.time", "something else"}},
    {HEAD "domain: {lower: [0, 0]}\n", {"line 3: domain", "domain.upper is missing"}},
    {HEAD "domain: {thickness: 1 pc}\n", {"line 3: domain", "domain.lower is missing"}},
    {HEAD "domain: {lower: [0], upper: [1 pc]}\n", {"line 3: domain.lower", "1 entries"}},
    {HEAD "domain: {lower: [0, 0], upper: [1 pc, 1 pc, 1 pc]}\n",
     {"line 3: domain.upper", "3 entries for 2 axes"}},
    {HEAD "domain: {dimension: 3, lower: [0, 0], upper: [1 pc, 1 pc]}\n",
     {"line 3: domain.lower", "2 entries for 3 axes"}},
    {HEAD "domain: {dimension: 4, lower: [0, 0], upper: [1 pc, 1 pc]}\n",
     {"line 3: domain.dimension", "more than 3"}},
    {HEAD "domain:\n  lower: [0, 2 pc]\n  upper: [1 pc, 2 pc]\n",
     {"line 5: domain.upper", "\"2 pc\" is not above \"2 pc\""}},
    {HEAD "domain: {lower: [0, 0], upper: [1, 1]}\n", {"line 3: domain.upper", "has no unit"}},
    {HEAD "domain: {lower: [0, 0], upper: [1 pc, 1 pc], boundaries: [periodic]}\n",
     {"line 3: domain.boundaries", "1 entries for 2 axes"}},
    {HEAD "domain: {lower: [0, 0], upper: [1 pc, 1 pc], boundaries: [periodic, shut]}\n",
     {"line 3: domain.boundaries", "\"shut\"", "periodic, closed, open"}},
    {HEAD "domain: {lower: [0, 0], upper: [1 pc, 1 pc], thickness: -1 pc}\n",
     {"line 3: domain.thickness", "greater than 0"}},
    {HEAD "domain: {lower: [0, 0, 0], upper: [1 pc, 1 pc, 1 pc], thickness: 1 pc}\n",
     {"line 3: domain.thickness", "2-D"}},
    {HEAD "diffusion: {parallel: 3e28}\n",
     {"line 3: diffusion.parallel", "has no unit", "3e28 cm^2/s"}},
    {HEAD "diffusion: {parallel: -1 cm^2/s}\n", {"line 3: diffusion.parallel", "less than 0"}},
    {HEAD "diffusion: {parallel: }\n", {"line 3: diffusion.parallel", "has no value"}},
    {HEAD "diffusion:\n  perpendicular: {constant: 1 cm/s}\n",
     {"line 4: diffusion.perpendicular.constant", "something else"}},
    {HEAD "diffusion:\n  perpendicular: {}\n",
     {"line 4: diffusion.perpendicular", "exactly one of constant, record, power"}},
    {HEAD "diffusion:\n  parallel: {constant: 1 cm^2/s, record: yes}\n",
     {"line 4: diffusion.parallel", "exactly one"}},
    {HEAD "diffusion:\n  parallel: {record: no}\n",
     {"line 4: diffusion.parallel.record", "no says nothing"}},
    {HEAD "diffusion:\n  parallel: {record: maybe}\n",
     {"line 4: diffusion.parallel.record", "yes or no"}},
    {HEAD "diffusion:\n  parallel: {power: {density: 1 g/cm^3, density_index: 1}}\n",
     {"line 4: diffusion.parallel.power", "key at"}},
    {HEAD "diffusion:\n  parallel: {power: {at: 1 cm^2/s, density_index: 1}}\n",
     {"line 4: diffusion.parallel.power", "key density"}},
    {HEAD "diffusion:\n  parallel: {power: {at: 1 cm^2/s, field_index: 1}}\n",
     {"line 4: diffusion.parallel.power", "key field"}},
    {HEAD "diffusion:\n  parallel: {power: {at: 1 cm^2/s}}\n",
     {"line 4: diffusion.parallel.power", "varies with nothing"}},
    {HEAD "diffusion:\n  parallel: {power: {at: 1 cm^2/s, field: 0 G, field_index: 1}}\n",
     {"line 4: diffusion.parallel.power.field", "greater than 0"}},
    {HEAD "diffusion: {unmagnetised: maybe}\n",
     {"line 3: diffusion.unmagnetised", "isotropic, none"}},
    {HEAD "geometry: {smoothing: box}\n",
     {"line 3: geometry.smoothing", "\"box\"", "wendland-c2"}},
    {HEAD "geometry:\n\n  neighbours: 5\n", {"line 5: geometry.neighbours", "less than 6"}},
    {HEAD "geometry: {neighbours: 1e9}\n", {"line 3: geometry.neighbours", "more than 1000"}},
    {HEAD "geometry: {neighbours: 48 pc}\n", {"line 3: geometry.neighbours", "stray"}},
    {HEAD "geometry: {neighbours: .nan}\n", {"line 3: geometry.neighbours", "finite number"}},
    {HEAD "geometry: {closure: 0}\n", {"line 3: geometry.closure", "greater than 0"}},
    {HEAD "geometry: {closure: 2}\n", {"line 3: geometry.closure", "more than 1"}},
    {HEAD "geometry: {sweeps: 0}\n", {"line 3: geometry.sweeps", "less than 1"}},
    {HEAD "geometry: {close_faces: 3}\n", {"line 3: geometry.close_faces", "yes or no"}},
    {HEAD "exchange: {angle_power: -1}\n", {"line 3: exchange.angle_power", "less than 0"}},
    {HEAD "exchange: {angle_share: 1.1}\n", {"line 3: exchange.angle_share", "more than 1"}},
    {HEAD "stepping: {scheme: magic}\n", {"line 3: stepping.scheme", "rkg2, rkl2, euler"}},
    {HEAD "stepping: {stages: 10}\n", {"line 3: stepping.stages", "10 is even"}},
    {HEAD "stepping: {stages: 1}\n", {"line 3: stepping.stages", "rkg2 takes 3 to"}},
    {HEAD "stepping: {stages: 1001}\n", {"line 3: stepping.stages", "more than 255"}},
    {HEAD "stepping: {stages: -3}\n", {"line 3: stepping.stages", "less than 1"}},
    {HEAD "stepping: {scheme: euler, stages: 3}\n",
     {"line 3: stepping.stages", "euler takes 1 to 1"}},
    {HEAD "stepping: {margin: 1.5}\n", {"line 3: stepping.margin", "more than 1"}},
    {HEAD "stepping: {tolerance: 0}\n", {"line 3: stepping.tolerance", "greater than 0"}},
    {HEAD "stepping: {tolerance: -1e-4}\n", {"line 3: stepping.tolerance", "greater than 0"}},
    {HEAD "stepping: {first: 1 Myr, fixed: 1 Myr}\n",
     {"line 3: stepping.first", "stepping.fixed"}},
    {HEAD "stepping: {first: 1}\n", {"line 3: stepping.first", "has no unit"}},
};

START_TEST(mistakes_are_named) {
  wend_setup s;
  const wend_status status = read_text(broken[_i].text, &s);
  ck_assert_msg(status == WEND_ERR_SETUP, "taken: %s", broken[_i].text);
  ck_assert(spread_same_text(team.text));
  ck_assert_msg(strstr(team.text, "setup.yaml") != NULL, "no file: %s", team.text);
  for (int k = 0; k < 3 && broken[_i].word[k] != NULL; k++)
    ck_assert_msg(strstr(team.text, broken[_i].word[k]) != NULL, "\"%s\" is not in: %s",
                  broken[_i].word[k], team.text);
  ck_assert_ptr_null(s.text);
}
END_TEST

START_TEST(unusable_files_are_named) {
  wend_setup s;
  ck_assert_int_eq(wend_setup_read(&team, scratch_path("nowhere.yaml"), &s), WEND_ERR_FILE);
  ck_assert_ptr_nonnull(strstr(team.text, "nowhere.yaml"));
  ck_assert_int_eq(wend_setup_read(&team, scratch_path("."), &s), WEND_ERR_FILE);
  scratch_write("binary.yaml", 4, "a\0b");
  ck_assert_int_eq(wend_setup_read(&team, scratch_path("binary.yaml"), &s), WEND_ERR_FILE);
  ck_assert_ptr_nonnull(strstr(team.text, "no text file"));
  char *large = malloc(2 << 20);
  memset(large, '#', 2 << 20);
  scratch_write("large.yaml", 2 << 20, large);
  free(large);
  ck_assert_int_eq(wend_setup_read(&team, scratch_path("large.yaml"), &s), WEND_ERR_FILE);
  ck_assert_ptr_nonnull(strstr(team.text, "larger"));
}
END_TEST

/* An allocation that fails on one rank alone is an error on all, and the next reading is sound.
 */
START_TEST(failing_allocations_are_errors) {
  wend_setup s;
  int number = 0;
  for (bool failed = true; failed && number < 100; number++) {
    spread_break(team.rank == team.size - 1 ? number : -1);
    const wend_status status = read_text(whole, &s);
    spread_break(-1);
    failed = status == WEND_ERR_MEMORY;
    ck_assert_msg(failed || status == WEND_OK, "%s", team.text);
    wend_setup_reset(&s);
  }
  ck_assert_int_gt(number, 3);
  ck_assert_int_lt(number, 100);
}
END_TEST

/* Vectors of Fowler, Noll, Vo & Eastlake (RFC 9923, appendix C). */
START_TEST(hash_is_fnv_1a) {
  wend_setup s = {.text = (char[]){""}};
  ck_assert_uint_eq(wend_setup_hash(&s), 0xcbf29ce484222325u);
  s.text = (char[]){"a"};
  ck_assert_uint_eq(wend_setup_hash(&s), 0xaf63dc4c8601ec8cu);
  s.text = (char[]){"foobar"};
  ck_assert_uint_eq(wend_setup_hash(&s), 0x85944171f73967e8u);
}
END_TEST

START_TEST(each_key_is_explained_once) {
  char *text = NULL;
  size_t size = 0;
  FILE *out = open_memstream(&text, &size);
  wend_setup_explain(out);
  fclose(out);
  for (int k = 0; k < wend_key_count(); k++) {
    const wend_key *key = wend_key_at(k);
    char line[128];
    snprintf(line, sizeof line, "\n%s ", key->path);
    const char *found = strstr(text, line);
    ck_assert_msg(found != NULL && strstr(found + 1, line) == NULL, "%s", key->path);
    ck_assert_msg(strstr(found, key->meaning) != NULL && strlen(key->meaning) > 5, "%s",
                  key->path);
    ck_assert_int_eq(wend_key_find(key->path), k);
  }
  ck_assert_ptr_null(wend_key_at(wend_key_count()));
  free(text);
}
END_TEST

int main(int count, char **arguments) {
  MPI_Init(&count, &arguments);
  wend_team_init(&team, MPI_COMM_WORLD);
  team.allocate = spread_allocate;
  scratch_begin();
  Suite *suite = suite_create("setup");
  TCase *tc = tcase_create("setup");
  tcase_add_test(tc, every_key_is_understood);
  tcase_add_test(tc, defaults_are_those_of_the_library);
  tcase_add_test(tc, short_forms_and_plain_boxes);
  tcase_add_loop_test(tc, mistakes_are_named, 0, (int)(sizeof broken / sizeof broken[0]));
  tcase_add_test(tc, unusable_files_are_named);
  tcase_add_test(tc, failing_allocations_are_errors);
  tcase_add_test(tc, hash_is_fnv_1a);
  tcase_add_test(tc, each_key_is_explained_once);
  suite_add_tcase(suite, tc);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, team.rank == 0 ? CK_NORMAL : CK_SILENT);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  scratch_end();
  wend_team_reset(&team);
  MPI_Finalize();
  return failed != 0;
}
