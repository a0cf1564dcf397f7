/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_streaming.c: streaming flux in both limits, pairs from both ends, the diffusion it
 * contains, and the heat of a pair. */
#include "streaming.h"

#include "exchange.h"
#include "web.h"

#include <check.h>
#include <math.h>
#include <stdlib.h>

static const web_plan plan = {2, 3, 12, 0.3, 2.6, 1};

/* A web with everything that the three passes read and write. */
typedef struct stage {
  web w;
  wend_operator_source source;
  double (*speed)[2], (*state)[2], (*ratio)[2];
  double *room, *most, *root, *heat;
  float *alpha, *beta, *slope, *kept, *anti;
  wend_streaming_pairs columns;
  wend_streaming_source streaming;
} stage;

static void stage_create(stage *s, double v, double ell) {
  s->w = web_create(&plan, 3);
  web_close(&s->w);
  web_magnetise(&s->w, false, 3);
  s->source = web_operator(&s->w);
  const size_t n = (size_t)s->w.l.n;
  s->speed = calloc(n, sizeof *s->speed);
  s->state = calloc(n, sizeof *s->state);
  s->ratio = calloc(n, sizeof *s->ratio);
  double **const column[] = {&s->room, &s->most, &s->root, &s->heat};
  for (int k = 0; k < 4; k++) *column[k] = calloc(n, sizeof(double));
  s->anti = web_column(&s->w);
  float **const pair[] = {
      &s->alpha,        &s->beta,          &s->slope,         &s->kept,
      &s->columns.pull, &s->columns.share, &s->columns.reach, &s->columns.fraction};
  for (int k = 0; k < 8; k++) *pair[k] = web_column(&s->w);
  for (size_t i = 0; i < n; i++) {
    s->speed[i][0] = v * (1 + 0.5 * sin(3.0 * (double)i));
    s->speed[i][1] = ell;
    s->state[i][0] = i % 17 == 0 ? 0 : 1 + exp(4 * sin(0.7 * (double)i));
    s->root[i] = sqrt(sqrt(s->state[i][0]));
  }
  s->streaming =
      (wend_streaming_source){(const double(*)[2])s->w.kappa, (const double(*)[2])s->speed};
  const wend_pairs *p = &s->w.l.pairs;
  wend_operator_slope(p, s->w.l.all, &s->source, s->w.faces.arm, s->slope);
  wend_operator_along(p, s->w.l.all, s->source.field, s->w.faces.area, s->alpha, s->beta);
  wend_streaming_columns(p, s->w.l.all, &s->source, &s->w.faces, &s->columns);
  wend_streaming_bounds(p, s->w.l.all, &s->source.face, &s->streaming, &s->columns, s->room,
                        s->most);
}

static void pass_1_and_2(stage *s) {
  const wend_pairs *p = &s->w.l.pairs;
  wend_streaming_flux(p, s->w.l.all, s->slope, &s->streaming, s->state);
  wend_streaming_ratios(p, s->w.l.all, s->alpha, s->beta, &s->streaming, &s->columns, s->room,
                        (const double(*)[2])s->state, s->kept, s->anti, s->ratio);
}

static void stage_destroy(stage *s) {
  web_destroy(&s->w);
  free(s->speed);
  free(s->state);
  free(s->ratio);
  void *const rest[] = {s->room,
                        s->most,
                        s->root,
                        s->heat,
                        s->anti,
                        s->alpha,
                        s->beta,
                        s->slope,
                        s->kept,
                        s->columns.pull,
                        s->columns.share,
                        s->columns.reach,
                        s->columns.fraction};
  for (size_t k = 0; k < sizeof rest / sizeof *rest; k++) free(rest[k]);
}

/* With v_A = 0 the three passes are those of diffusion, up to the float in which s_ij is
 * formed. */
START_TEST(without_speed_it_is_diffusion) {
  stage s;
  stage_create(&s, 0, 10);
  const size_t n = (size_t)s.w.l.n, entries = (size_t)web_entries(&s.w);
  const wend_pairs *p = &s.w.l.pairs;
  float *kept = web_column(&s.w), *anti = web_column(&s.w);
  double *full = calloc(n, sizeof *full), *both = calloc(n, sizeof *both);
  double *kappa = calloc(n, sizeof *kappa);
  double(*state)[2] = calloc(n, sizeof *state), (*ratio)[2] = calloc(n, sizeof *ratio);
  pass_1_and_2(&s);
  for (size_t i = 0; i < n; i++) {
    state[i][0] = s.state[i][0];
    kappa[i] = s.w.kappa[i][0];
  }
  wend_operator_low_order(p, s.w.l.all, &s.source, &s.w.faces, kept, full, both);
  wend_exchange_flux_along(p, s.w.l.all, s.slope, kappa, state);
  wend_exchange_ratios_along(p, s.w.l.all, s.alpha, s.beta, kept, full,
                             (const double(*)[2])state, anti, ratio);
  for (size_t i = 0; i < n; i++) ck_assert(state[i][1] == s.state[i][1]);
  for (size_t k = 0; k < entries; k++) {
    const double size = fabs(kept[k]) + fabs(s.kept[k]);
    ck_assert(fabs((double)kept[k] - s.kept[k]) <= 1e-6 * size); /* two roundings to float */
    ck_assert(s.columns.fraction[k] == 0);
  }
  free(kept);
  free(full);
  free(both);
  free(anti);
  free(kappa);
  free(state);
  free(ratio);
  stage_destroy(&s);
}
END_TEST

/* Full streaming where |e/g| << ell, diffusion with gamma v_A ell where it is long, nothing
 * where e = 0. */
START_TEST(flux_has_both_limits) {
  const double ells[] = {1e9, 1e-9};
  for (int k = 0; k < 2; k++) {
    stage s;
    stage_create(&s, 2, ells[k]);
    for (int32_t i = 0; i < s.w.l.n; i++) s.w.kappa[i][0] = s.w.kappa[i][1] = 0;
    wend_streaming_flux(&s.w.l.pairs, s.w.l.all, s.slope, &s.streaming, s.state);
    for (int32_t i = 0; i < s.w.l.n; i++) {
      double g = 0;
      for (int32_t m = 0; m < s.w.l.pairs.count[i]; m++) {
        const int64_t e = wend_pairs_entry(&s.w.l.pairs, i, m);
        g += s.slope[e] * (s.state[s.w.l.pairs.index[e]][0] - s.state[i][0]);
      }
      const double e = s.state[i][0], v = s.speed[i][0];
      const double full = -4.0 / 3 * v * e * (g > 0 ? 1 : g < 0 ? -1 : 0);
      const double diffusive = e > 0 ? -4.0 / 3 * v * ells[k] * g : 0;
      const double exact = k == 0 ? full : diffusive;
      ck_assert_msg(fabs(s.state[i][1] - exact) <= 1e-9 * fabs(exact) + 1e-300, "row %d", i);
    }
    stage_destroy(&s);
  }
}
END_TEST

/* Antidiffusive parts are odd, kept parts and fractions even, to the bit; the coefficient stays
 * bounded. */
START_TEST(both_ends_agree_and_the_coefficient_is_bounded) {
  stage s;
  stage_create(&s, 2, 3);
  pass_1_and_2(&s);
  for (int32_t i = 0; i < s.w.l.n; i++) {
    double full = 0, kept = 0;
    for (int32_t m = 0; m < s.w.l.pairs.count[i]; m++) {
      const int64_t k = wend_pairs_entry(&s.w.l.pairs, i, m), twin = web_twin(&s.w, i, k);
      ck_assert(web_same_float(s.anti[k], -s.anti[twin]) || s.anti[k] == 0);
      ck_assert(web_same_float(s.kept[k], s.kept[twin]));
      ck_assert(web_same_float(s.columns.fraction[k], s.columns.fraction[twin]));
      ck_assert(s.columns.fraction[k] >= 0 && s.columns.fraction[k] <= 1);
      kept += s.kept[k];
      full += fmax(0, s.kept[k]);
    }
    ck_assert(kept <= s.most[i] * (1 + 1e-6) && full >= 0);
  }
  stage_destroy(&s);
}
END_TEST

/* 2 tanh[ln(e_i/e_j)/8]/2 = (w_i - w_j)/(w_i + w_j): the heat against the C library's tanh and
 * log, summed over the limited exchange as the rate pass has it. */
START_TEST(heat_follows_its_formula) {
  stage s;
  stage_create(&s, 2, 3);
  pass_1_and_2(&s);
  const wend_pairs *p = &s.w.l.pairs;
  wend_streaming_heat(p, s.w.l.all, s.kept, s.columns.fraction, (const double(*)[2])s.state,
                      s.root, s.anti, (const double(*)[2])s.ratio, s.heat);
  for (int32_t i = 0; i < s.w.l.n; i++) {
    double sum = 0, size = 0;
    for (int32_t m = 0; m < p->count[i]; m++) {
      const int64_t k = wend_pairs_entry(p, i, m);
      const int32_t j = p->index[k];
      const double t = s.anti[k], ei = s.state[i][0], ej = s.state[j][0];
      const double c =
          t > 0 ? fmin(s.ratio[i][0], s.ratio[j][1]) : fmin(s.ratio[i][1], s.ratio[j][0]);
      const double leaves = s.kept[k] * (ei - ej) - c * t;
      const double lost = ei == ej ? 0 : ej == 0 ? 1 : ei == 0 ? -1 : tanh(log(ei / ej) / 8);
      sum += s.columns.fraction[k] * leaves * lost;
      size += fabs(s.columns.fraction[k] * leaves * lost);
    }
    ck_assert(fabs(s.heat[i] - sum) <= 1e-13 * size); /* some ten roundings a term */
  }
  stage_destroy(&s);
}
END_TEST

int main(void) {
  Suite *suite = suite_create("streaming");
  TCase *cases = tcase_create("streaming");
  tcase_add_test(cases, without_speed_it_is_diffusion);
  tcase_add_test(cases, flux_has_both_limits);
  tcase_add_test(cases, both_ends_agree_and_the_coefficient_is_bounded);
  tcase_add_test(cases, heat_follows_its_formula);
  suite_add_tcase(suite, cases);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  return failed != 0;
}
