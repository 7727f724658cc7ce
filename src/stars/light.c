/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * V light and its graininess. Populations of 0.03-14 Gyr come from one set of models, younger ones from another, which
 * is brought to the metallicities of the first and joined to it: a running median over 0.35 dex in age takes the spikes
 * of single tracks near 3 Myr away, and an offset that grows linearly in log age from 0 at 3 Myr closes the step of
 * about 0.1 mag at 0.03 Gyr. The metallicity of each set is its own metal mass fraction; no solar value enters. */
#include "stars/light.h"

#include "elfinwood/stars.h"
#include "stars/handle.h"

#include <gsl/gsl_sort.h>
#include <math.h>

enum { OLD_METALLICITIES = 9, OLD_AGES = 53, YOUNG_METALLICITIES = 5, YOUNG_AGES = 34 };
enum { MEDIAN_REACH = 3 }; /* ages to either side */
enum { GRID_AGES = 416 };  /* 0.01 dex apart */

#define FIRST_AGE 1e-3 /* Gyr */
#define LAST_AGE  14.0 /* Gyr */
#define FADE_AGE  6.5  /* log10 of years */

typedef enum { TOTAL, FLUCTUATION, MAGNITUDES } magnitude_kind;

static const struct {
  double metal_fraction, age; /* Gyr */
  double magnitude[MAGNITUDES];
} old[OLD_METALLICITIES][OLD_AGES] = {
#include "stars/tables/populations.inc"
};
static const struct {
  double metal_fraction, log_age; /* log10 of years */
  double magnitude[MAGNITUDES];
} young[YOUNG_METALLICITIES][YOUNG_AGES] = {
#include "stars/tables/young_populations.inc"
};

/* One metallicity of both sets, joined: magnitudes over ascending log10 age in years. */
typedef struct {
  double log_age[YOUNG_AGES + OLD_AGES], magnitude[YOUNG_AGES + OLD_AGES];
  size_t count;
} curve;

static double log_years(double age) {
  return log10(age) + 9.0;
}

static double running_median(magnitude_kind kind, size_t z, size_t i) {
  double window[2 * MEDIAN_REACH + 1];
  size_t reach = MEDIAN_REACH;
  if (i < reach)
    reach = i;
  if (YOUNG_AGES - 1 - i < reach)
    reach = YOUNG_AGES - 1 - i;
  for (size_t k = 0; k <= 2 * reach; k++)
    window[k] = young[z][i - reach + k].magnitude[kind];
  gsl_sort(window, 1, 2 * reach + 1);
  return window[reach];
}

/* The young set at the metallicity of the old one, linear in log metallicity. */
static void young_curve(curve *to, magnitude_kind kind, double metal_fraction) {
  double log_metals[YOUNG_METALLICITIES];
  for (size_t z = 0; z < YOUNG_METALLICITIES; z++)
    log_metals[z] = log(young[z][0].metal_fraction);
  ew_place place = ew_locate(log_metals, YOUNG_METALLICITIES, log(metal_fraction));
  to->count = YOUNG_AGES;
  for (size_t i = 0; i < YOUNG_AGES; i++) {
    to->log_age[i] = young[0][i].log_age;
    to->magnitude[i] =
        ew_between(running_median(kind, place.index, i), running_median(kind, place.index + 1, i), place.weight);
  }
}

static double curve_at(const curve *of, double log_age) {
  ew_place place = ew_locate(of->log_age, of->count, log_age);
  return ew_between(of->magnitude[place.index], of->magnitude[place.index + 1], place.weight);
}

/* Continues the young curve with the old set from its first age on. */
static void join_old(curve *to, magnitude_kind kind, size_t z) {
  double joint = log_years(old[z][0].age);
  double step = old[z][0].magnitude[kind] - curve_at(to, joint);
  size_t count = 0;
  while (count < YOUNG_AGES && to->log_age[count] < joint) {
    to->magnitude[count] += step * fmax((to->log_age[count] - FADE_AGE) / (joint - FADE_AGE), 0.0);
    count++;
  }
  for (size_t i = 0; i < OLD_AGES; i++, count++) {
    to->log_age[count] = log_years(old[z][i].age);
    to->magnitude[count] = old[z][i].magnitude[kind];
  }
  to->count = count;
}

/* The grid holds natural logarithms of luminosities. */
static void fill_column(ew_table *column, magnitude_kind kind, size_t z) {
  curve joined;
  young_curve(&joined, kind, old[z][0].metal_fraction);
  join_old(&joined, kind, z);
  for (size_t i = 0; i < GRID_AGES; i++) {
    double magnitude = curve_at(&joined, log_years(exp(ew_table_position(column, i))));
    column->value[i] = -0.4 * log(10.0) * (magnitude - EW_SUN_MAGNITUDE_V);
  }
}

static ew_status fill_grid(ew_age_grid *grid, magnitude_kind kind, ew_error *error) {
  double metals[OLD_METALLICITIES];
  for (size_t z = 0; z < OLD_METALLICITIES; z++)
    metals[z] = old[z][0].metal_fraction;
  ew_status status = ew_age_grid_make(grid, metals, OLD_METALLICITIES, FIRST_AGE, LAST_AGE, GRID_AGES, error);
  for (size_t z = 0; status == EW_OK && z < OLD_METALLICITIES; z++)
    fill_column(&grid->by_age[z], kind, z);
  return status;
}

ew_status ew_light_fill(ew_light *light, ew_error *error) {
  ew_status status = fill_grid(&light->luminosity, TOTAL, error);
  if (status == EW_OK)
    status = fill_grid(&light->fluctuation, FLUCTUATION, error);
  return status;
}

void ew_light_clear(ew_light *light) {
  ew_age_grid_clear(&light->luminosity);
  ew_age_grid_clear(&light->fluctuation);
}

double ew_luminosity_v(const ew_stars *stars, double age, double metal_fraction) {
  return exp(ew_age_grid_at(&stars->light.luminosity, age, metal_fraction));
}

double ew_fluctuation_luminosity_v(const ew_stars *stars, double age, double metal_fraction) {
  return exp(ew_age_grid_at(&stars->light.fluctuation, age, metal_fraction));
}
