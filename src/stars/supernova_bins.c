/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Where stars are not drawn one by one, supernovae are taken by bins of birth mass that step evenly in log lifetime.
 * What a star gives back is linear in its mass between published models, so the IMF average over such a segment is the
 * death of a star of the segment's mean mass: the averages below are exact. */
#include "stars/supernova_bins.h"

#include "elfinwood/stars.h"
#include "stars/handle.h"
#include "stars/locate.h"

#include <math.h>

/* Bins step evenly in the log lifetime of the most metal-poor stars of the table. */
static void fill_edges(const ew_stars *stars, double *edge) {
  double first = stars->parameters.supernova_mass, last = stars->parameters.collapse_mass;
  double longest = log(ew_lifetime(stars, first, 0.0)), shortest = log(ew_lifetime(stars, last, 0.0));
  edge[0] = first;
  for (int i = 1; i < EW_SUPERNOVA_BINS; i++)
    edge[i] = ew_mass_dying_at(stars, exp(ew_between(longest, shortest, (double)i / EW_SUPERNOVA_BINS)), 0.0);
  edge[EW_SUPERNOVA_BINS] = last;
}

/* Adds the supernovae per Msun formed between two masses without a model in between. */
static void add_segment(ew_death *sum, const ew_stars *stars, double from, double to, double metal_fraction) {
  double number = ew_imf_number(from, to), mass = ew_imf_mass(from, to) / number;
  double hypernovae = stars->parameters.hypernova_fraction;
  ew_death ordinary = ew_death_of(stars, mass, metal_fraction, false);
  ew_death strong = ew_death_of(stars, mass, metal_fraction, true);
  ew_death_add(sum, number * (1.0 - hypernovae), &ordinary);
  ew_death_add(sum, number * hypernovae, &strong);
}

static ew_death mean_death(const ew_stars *stars, double low, double high, double metal_fraction) {
  ew_death sum = {.fate = EW_FATE_CORE_COLLAPSE}, mean = sum;
  double from = low;
  for (int i = 0; i <= EW_YIELD_MASSES; i++) {
    double to = i < EW_YIELD_MASSES ? fmin(ew_yield_masses[i], high) : high;
    if (to > from) {
      add_segment(&sum, stars, from, to, metal_fraction);
      from = to;
    }
  }
  ew_death_add(&mean, 1.0 / ew_imf_number(low, high), &sum);
  return mean;
}

void ew_supernova_bins_fill(ew_stars *stars) {
  ew_supernova_bins *bins = &stars->supernova_bins;
  fill_edges(stars, bins->edge);
  bins->total = ew_imf_number(stars->parameters.supernova_mass, stars->parameters.collapse_mass);
  for (int i = 0; i < EW_SUPERNOVA_BINS; i++) {
    bins->number[i] = ew_imf_number(bins->edge[i], bins->edge[i + 1]);
    for (int z = 0; z < EW_YIELD_METALLICITIES; z++)
      bins->death[z][i] = mean_death(stars, bins->edge[i], bins->edge[i + 1], ew_yield_metals[z]);
  }
}

double ew_supernova_bin_edge(const ew_stars *stars, int edge) {
  return stars->supernova_bins.edge[edge];
}

double ew_supernova_bin_number(const ew_stars *stars, int bin) {
  return stars->supernova_bins.number[bin];
}

ew_death ew_supernova_bin_death(const ew_stars *stars, int bin, double metal_fraction) {
  const ew_supernova_bins *bins = &stars->supernova_bins;
  ew_place z = ew_locate(ew_yield_metals, EW_YIELD_METALLICITIES, metal_fraction);
  ew_death mean = {.fate = EW_FATE_CORE_COLLAPSE};
  ew_death_add(&mean, 1.0 - z.weight, &bins->death[z.index][bin]);
  ew_death_add(&mean, z.weight, &bins->death[z.index + 1][bin]);
  return mean;
}

double ew_supernovae_per_mass(const ew_stars *stars) {
  return stars->supernova_bins.total;
}
