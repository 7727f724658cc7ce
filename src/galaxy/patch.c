/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The neighbourhood: when it is ionized and how fast baryons stream, drawn once per root and realization; and what each
 * branch owes to its own luck. */
#include "elfinwood/galaxy.h"

#include <math.h>

const ew_process_record ew_structure_process = {
    .name = "structure",
    .meaning = "concentration and spin of haloes with their scatter",
    .source = "Diemer & Joyce 2019, ApJ 871, 168; Bullock et al. 2001, ApJ 555, 240",
    .rows = ew_structure_rows,
};

#define EARLIEST_REIONIZATION 20.0
#define LATEST_REIONIZATION   5.0

/* Streaming speed: three Gaussian components of equal rms (Tseliakhovich & Hirata 2010, PRD 82, 083520). */
static double draw_streaming(double rms, ew_stream *stream) {
  double sum = 0.0;
  for (int axis = 0; axis < 3; axis++) {
    double component = rms / sqrt(3.0) * ew_draw_normal(stream);
    sum += component * component;
  }
  return sqrt(sum);
}

/* Once the patch is ionized, molecules help no more. */
static double threshold_at(const ew_patch *patch, const ew_model *model, const ew_calendar *calendar, size_t slot) {
  double atomic = calendar->atomic_mass[slot], z = calendar->redshift[slot];
  if (model->first_stars.threshold != EW_FIRST_STARS_MOLECULAR || z < patch->reionization_redshift)
    return atomic;
  double background = model->first_stars.background * ew_lyman_werner_background(z);
  return fmin(atomic, ew_molecular_threshold(z, background, patch->streaming_velocity));
}

static void fill_thresholds(ew_patch *patch, const ew_model *model, const ew_calendar *calendar) {
  for (size_t k = 0; k < calendar->slot_count; k++)
    patch->threshold_mass[k] = threshold_at(patch, model, calendar, k);
}

static void fill_characteristic_mass(ew_patch *patch, const ew_model *model, const ew_calendar *calendar,
                                     double hubble) {
  for (size_t k = 0; k < calendar->slot_count; k++)
    patch->characteristic_mass[k] = ew_characteristic_mass(hubble, calendar->redshift[k], patch->reionization_redshift);
  if (model->reionization.suppression == EW_SUPPRESSION_NONE)
    for (size_t k = 0; k < calendar->slot_count; k++)
      patch->characteristic_mass[k] = 0.0;
}

ew_status ew_patch_draw(ew_patch *patch, const ew_world *world, const ew_model *model, const ew_calendar *calendar,
                        const ew_draws *draws, ew_arena *arena, ew_error *error) {
  ew_stream stream = ew_stream_open(draws, EW_PROCESS_PATCH, ew_branch_key_root(), 0);
  const ew_reionization_parameters *p = &model->reionization;
  double z = p->redshift + p->redshift_scatter * ew_draw_normal(&stream);
  patch->reionization_redshift = fmin(fmax(z, LATEST_REIONIZATION), EARLIEST_REIONIZATION);
  patch->streaming_velocity = draw_streaming(model->first_stars.streaming_rms, &stream);
  patch->characteristic_mass = ew_arena_take(arena, 2 * calendar->slot_count * sizeof(double));
  if (!patch->characteristic_mass)
    return ew_fail_memory(error, "a patch");
  patch->threshold_mass = patch->characteristic_mass + calendar->slot_count;
  fill_characteristic_mass(patch, model, calendar, ew_cosmology_get(world->cosmology)->hubble);
  fill_thresholds(patch, model, calendar);
  return EW_OK;
}

/* Probability min(1, 10^(-(z - 6)/3)) that gas is enriched from outside by redshift z: own choice. */
static double enrichment_redshift(ew_stream *stream) {
  return 6.0 - 3.0 * log10(ew_draw_uniform(stream));
}

double ew_enrichment_redshift_draw(const ew_draws *draws, uint64_t branch_key) {
  ew_stream stream = ew_stream_open(draws, EW_PROCESS_STRUCTURE, branch_key, 0);
  return enrichment_redshift(&stream);
}

ew_branch_luck ew_branch_luck_draw(const ew_model *model, const ew_draws *draws, uint64_t branch_key) {
  ew_stream stream = ew_stream_open(draws, EW_PROCESS_STRUCTURE, branch_key, 0);
  const ew_structure_parameters *s = &model->structure;
  ew_branch_luck luck;
  luck.enrichment_redshift = enrichment_redshift(&stream);
  luck.concentration_factor = pow(10.0, s->concentration_scatter * ew_draw_normal(&stream));
  luck.spin = s->spin_median * exp(s->spin_scatter * ew_draw_normal(&stream));
  luck.external_metals = EW_SOLAR_METALS * pow(10.0, model->gas.external_metallicity +
                                                         model->gas.external_scatter * ew_draw_normal(&stream));
  luck.external_metals = fmin(luck.external_metals, EW_SOLAR_METALS);
  return luck;
}
