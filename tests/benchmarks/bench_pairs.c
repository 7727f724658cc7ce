/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What common random numbers are worth: two models differ by 5 per cent in one feedback parameter. The variance of the
 * difference that this makes to a galaxy, with both on the same draws, over the variance with independent draws on the
 * same tree. A ratio of 0.1 means that one tree tells as much as ten. */
#include "demo.h"

#define CHANGE   1.05
#define LOG_LOW  8.0 /* log10 of Msun: bins of half a decade from here */
#define LOG_BIN  0.5
#define REQUIRED 0.3

enum { TREES = 1000, BINS = 5, QUANTITIES = 3, DRAWS = 2, MODELS = 2 };

static const char *const quantity_names[QUANTITIES] = {"[Fe/H]", "log10 L", "log10 r_half"};

/* The central galaxy of one tree under both models, with two sets of draws; NaN where it has no stars. */
typedef struct {
  double log_mass;
  double value[DRAWS][MODELS][QUANTITIES];
} sample;

typedef struct {
  sample samples[TREES];
  size_t count;
  int draws; /* of the run under way */
} collection;

static ew_status take(void *context, const ew_tree_row *tree, const ew_galaxy_row *rows, size_t count,
                      ew_error *error) {
  (void)error;
  collection *c = context;
  sample *s = &c->samples[c->count++];
  s->log_mass = log10(tree->root_mass);
  for (size_t i = 0; i < count; i++) {
    const ew_observables *o = &rows[i].observed;
    double *value = s->value[c->draws][rows[i].model];
    value[0] = o->metallicity;
    value[1] = o->luminosity_v > 0.0 ? log10(o->luminosity_v) : NAN;
    value[2] = log10(o->half_light_radius);
  }
  return EW_OK;
}

static void run(const ew_laboratory *laboratory, collection *c) {
  ew_model models[MODELS] = {laboratory->settings.model, laboratory->settings.model};
  models[1].feedback.energy_share *= CHANGE;
  for (c->draws = 0; c->draws < DRAWS; c->draws++) {
    ew_plan plan = {.laboratory = laboratory, .models = models, .model_count = MODELS, .tree_count = TREES};
    for (int p = EW_PROCESS_ASSEMBLY + 1; p < EW_PROCESS_COUNT; p++)
      plan.realization_offset[p] = (uint64_t)c->draws;
    uint64_t done;
    ew_error error = {0};
    c->count = 0;
    need(ew_run(&plan, &(ew_row_sink){take, c}, &done, &error), &error);
  }
}

typedef struct {
  double count, sum, squares;
} spread;

static void add(spread *s, double difference) {
  if (isnan(difference))
    return;
  s->count += 1.0;
  s->sum += difference;
  s->squares += difference * difference;
}

static double variance(const spread *s) {
  double mean = s->sum / s->count;
  return s->squares / s->count - mean * mean;
}

static void report(const collection *c, double low, double high, int quantity) {
  spread paired = {0}, unpaired = {0};
  for (size_t i = 0; i < c->count; i++) {
    const sample *s = &c->samples[i];
    if (!(s->log_mass >= low && s->log_mass < high))
      continue;
    for (int d = 0; d < DRAWS; d++) {
      add(&paired, s->value[d][1][quantity] - s->value[d][0][quantity]);
      add(&unpaired, s->value[1 - d][1][quantity] - s->value[d][0][quantity]);
    }
  }
  double ratio = variance(&paired) / variance(&unpaired);
  printf("%4.1f-%4.1f  %-12s %6.0f %9.4f %10.4f %10.4f %8.4f%s\n", low, high, quantity_names[quantity], paired.count,
         paired.sum / paired.count, sqrt(variance(&paired)), sqrt(variance(&unpaired)), ratio,
         ratio < REQUIRED ? "" : "  above 0.3");
}

int main(void) {
  ew_core_start();
  static collection c;
  ew_laboratory *laboratory = demo_laboratory();
  run(laboratory, &c);
  printf("feedback.energy_share times %g, %d trees of the demo, 2 draws each\n", CHANGE, TREES);
  printf("%9s  %-12s %6s %9s %10s %10s %8s\n", "log10 M", "of centrals", "pairs", "mean", "paired", "unpaired",
         "ratio of");
  printf("%9s  %-12s %6s %9s %10s %10s %8s\n", "[Msun]", "with stars", "", "change", "scatter", "scatter", "variance");
  for (int q = 0; q < QUANTITIES; q++)
    report(&c, LOG_LOW, LOG_LOW + BINS * LOG_BIN, q);
  for (int b = 0; b < BINS; b++)
    for (int q = 0; q < QUANTITIES; q++)
      report(&c, LOG_LOW + b * LOG_BIN, LOG_LOW + (b + 1) * LOG_BIN, q);
  ew_laboratory_free(laboratory);
}
