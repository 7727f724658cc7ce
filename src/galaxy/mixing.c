/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Incomplete mixing: the fewer supernovae have enriched the gas, the more the metallicity of its star clusters scatters
 * about the gas's mean. Own law; the mean over clusters is that of the gas. */
#include "galaxy/state.h"

#include <math.h>

#define ROW(field) offsetof(ew_mixing_parameters, field)

const ew_parameter ew_mixing_rows[] = {
    {.name = "enrichment.mixing_floor",
     .type = EW_REAL,
     .offset = ROW(mixing_floor),
     .unit = "dex",
     .standard = "0.1",
     .low = 0,
     .high = 1,
     .meaning = "scatter of metallicity between clusters born of well-mixed gas",
     .source = "own choice"},
    {.name = "enrichment.mixing_scatter",
     .type = EW_REAL,
     .offset = ROW(mixing_scatter),
     .unit = "dex",
     .standard = "0.8",
     .low = 0,
     .high = 2,
     .meaning = "the same for gas enriched by one supernova; falls with the root of their number",
     .source = "own choice"},
    {.name = "enrichment.element_scatter",
     .type = EW_REAL,
     .offset = ROW(element_scatter),
     .unit = "dex",
     .standard = "0.05",
     .low = 0,
     .high = 0.5,
     .meaning = "scatter of each element about the common draw",
     .source = "own choice"},
    {.name = NULL},
};

const ew_process_record ew_mixing_process = {
    .name = "mixing",
    .meaning = "scatters the abundances of star clusters about those of the gas",
    .source = "own law",
    .rows = ew_mixing_rows,
};

#define LARGEST_TAKE        0.5 /* of what the gas has of a metal, by one cluster */
#define HIGHEST_METAL_SHARE 0.5 /* of a cluster's mass, however the draw falls */

/* A factor of that scatter in dex whose mean is 1. */
static double mean_one_factor(double scatter, double normal) {
  double log_scatter = scatter * log(10.0);
  return exp(log_scatter * normal - 0.5 * log_scatter * log_scatter);
}

/* Hydrogen and helium fill up what metals leave, in the ratio of the gas. */
static void fill_up(ew_composition *fraction) {
  double metals = ew_composition_metals(fraction);
  if (metals > HIGHEST_METAL_SHARE)
    for (int i = EW_HELIUM + 1; i < EW_ELEMENT_COUNT; i++)
      fraction->mass[i] *= HIGHEST_METAL_SHARE / metals;
  double rest = 1.0 - fmin(metals, HIGHEST_METAL_SHARE);
  double light = fraction->mass[EW_HYDROGEN] + fraction->mass[EW_HELIUM];
  fraction->mass[EW_HYDROGEN] *= rest / light;
  fraction->mass[EW_HELIUM] *= rest / light;
}

void ew_hold_supernovae(ew_galaxy *galaxy, double number) {
  galaxy->held += number;
  galaxy->held_squares += number;
}

void ew_release_supernovae(ew_galaxy *galaxy, double share) {
  double kept = 1.0 - fmin(share, 1.0);
  galaxy->held *= kept;
  galaxy->held_squares *= kept * kept;
}

/* (sum w)^2 / sum w^2 over supernovae of which the gas holds shares w: a wind that takes the same part of all leaves
 * it. */
double ew_effective_supernovae(const ew_galaxy *galaxy) {
  return galaxy->held_squares > 0.0 ? fmax(galaxy->held * galaxy->held / galaxy->held_squares, 1.0) : 1.0;
}

/* The factor, at most 1, that keeps a cluster from taking more than a share of what the gas has of any metal. */
static double within_reach(const ew_composition *gas, const ew_composition *fraction, double cluster_mass) {
  double factor = 1.0;
  for (int i = EW_HELIUM + 1; i < EW_ELEMENT_COUNT; i++)
    if (fraction->mass[i] * cluster_mass > LARGEST_TAKE * gas->mass[i])
      factor = fmin(factor, LARGEST_TAKE * gas->mass[i] / (fraction->mass[i] * cluster_mass));
  return factor;
}

/* Normal stars have at least the metals below which first stars would form; 0 where none do. */
static double critical_metals(const ew_model *model) {
  if (model->first_stars.threshold == EW_FIRST_STARS_NONE)
    return 0.0;
  return EW_SOLAR_METALS * pow(10.0, model->first_stars.critical_metallicity);
}

void ew_mix_cluster(const ew_step *step, ew_stream *stream, double cluster_mass, ew_composition *fraction) {
  const ew_mixing_parameters *p = &step->environment->model->mixing;
  const ew_composition *gas = &step->galaxy->ledger.in[EW_DISC_GAS];
  double mass = ew_composition_mass(gas), number = ew_effective_supernovae(step->galaxy);
  double scatter = sqrt(p->mixing_floor * p->mixing_floor + p->mixing_scatter * p->mixing_scatter / number);
  double common = mean_one_factor(scatter, ew_draw_normal(stream));
  for (int i = 0; i < EW_ELEMENT_COUNT; i++) {
    fraction->mass[i] = gas->mass[i] / mass;
    if (i > EW_HELIUM)
      fraction->mass[i] *= common * mean_one_factor(p->element_scatter, ew_draw_normal(stream));
  }
  double factor = within_reach(gas, fraction, cluster_mass);
  double least = critical_metals(step->environment->model), metals = factor * ew_composition_metals(fraction);
  if (metals > 0.0 && metals < least)
    factor *= least / metals;
  for (int i = EW_HELIUM + 1; i < EW_ELEMENT_COUNT; i++)
    fraction->mass[i] *= factor;
  fill_up(fraction);
}
