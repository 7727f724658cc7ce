/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Supernovae and hypernovae after core collapse. The published masses are total ejecta; what the star has made is what
 * exceeds its initial content. The initial mixture of the models is taken as solar metals scaled to their metal
 * fraction Z, helium 0.247 + 1.4 Z and hydrogen for the rest; hydrogen closes the sum, so that rounding in the tables
 * cannot create mass. No model destroys metals on balance, hence what is made of them can be added to a star of any
 * mixture; hydrogen and helium destroyed stay below 0.38 and 0.02 of the ejected mass. */
#include "elfinwood/stars.h"
#include "stars/deaths.h"
#include "stars/locate.h"

#include <math.h>

typedef struct {
  double metal_fraction, mass, energy, remnant, ejecta, hydrogen, helium;
  double listed[EW_LISTED_METALS];
  double metals;
} model;

static const model supernovae[1 + EW_YIELD_METALLICITIES * EW_YIELD_MASSES] = {
#include "stars/tables/supernovae.inc"
};
static const model hypernovae[EW_YIELD_METALLICITIES * EW_HYPERNOVA_MASSES] = {
#include "stars/tables/hypernovae.inc"
};

const double ew_yield_masses[EW_YIELD_MASSES] = {13.0, 15.0, 18.0, 20.0, 25.0, 30.0, 40.0};
const double ew_yield_metals[EW_YIELD_METALLICITIES] = {0.0, 0.001, 0.004, 0.008, 0.02};
static const double metal_free_masses[1 + EW_YIELD_MASSES] = {11.0, 13.0, 15.0, 18.0, 20.0, 25.0, 30.0, 40.0};
static const double hypernova_masses[EW_HYPERNOVA_MASSES] = {20.0, 25.0, 30.0, 40.0};

#define HELIUM_PER_METAL 1.4
#define HYPERNOVA_LOWEST 20.0

static ew_death net_yield(const model *of, ew_fate fate) {
  ew_death death = {.fate = fate, .remnant = of->remnant, .energy = of->energy, .ejected = of->mass - of->remnant};
  death.made = ew_tabulated_metals(of->listed, of->metals);
  double initial_metals = of->metal_fraction * of->ejecta;
  for (int i = EW_HELIUM + 1; i < EW_ELEMENT_COUNT; i++)
    death.made.mass[i] -= initial_metals * ew_solar.mass[i] / ew_composition_metals(&ew_solar);
  double initial_helium = ew_primordial.mass[EW_HELIUM] + HELIUM_PER_METAL * of->metal_fraction;
  death.made.mass[EW_HELIUM] = of->helium - of->ejecta * initial_helium;
  death.made.mass[EW_HYDROGEN] = -(death.made.mass[EW_HELIUM] + ew_composition_metals(&death.made));
  return death;
}

/* The tables' own wind can be a few 1e-3 Msun below zero, by rounding, where there is none. */
static double wind_share(const model *of) {
  return fmax(of->mass - of->remnant - of->ejecta, 0.0) / of->mass;
}

void ew_core_collapse_fill(ew_core_collapse *models) {
  models->supernova[0] = net_yield(&supernovae[0], EW_FATE_CORE_COLLAPSE);
  for (int i = 0; i < EW_YIELD_METALLICITIES * EW_YIELD_MASSES; i++) {
    models->supernova[1 + i] = net_yield(&supernovae[1 + i], EW_FATE_CORE_COLLAPSE);
    models->wind_share[i] = wind_share(&supernovae[1 + i]);
  }
  for (int i = 0; i < EW_YIELD_METALLICITIES * EW_HYPERNOVA_MASSES; i++)
    models->hypernova[i] = net_yield(&hypernovae[i], EW_FATE_HYPERNOVA);
}

static void add_between(ew_death *sum, double weight, const ew_death *chain, ew_place place) {
  if (!(weight > 0.0))
    return;
  ew_death_add(sum, weight * (1.0 - place.weight), &chain[place.index]);
  ew_death_add(sum, weight * place.weight, &chain[place.index + 1]);
}

ew_death ew_core_collapse_of(const ew_core_collapse *models, double mass, double metal_fraction, bool hypernova) {
  bool strong = hypernova && mass >= HYPERNOVA_LOWEST;
  size_t count = strong ? EW_HYPERNOVA_MASSES : EW_YIELD_MASSES;
  const ew_death *models_of_mass = strong ? models->hypernova : &models->supernova[1];
  ew_place place = ew_locate(strong ? hypernova_masses : ew_yield_masses, count, mass);
  ew_place z = ew_locate(ew_yield_metals, EW_YIELD_METALLICITIES, metal_fraction);
  ew_death death = {.fate = strong ? EW_FATE_HYPERNOVA : EW_FATE_CORE_COLLAPSE};
  add_between(&death, 1.0 - z.weight, &models_of_mass[z.index * count], place);
  add_between(&death, z.weight, &models_of_mass[(z.index + 1) * count], place);
  death.ejected = mass - death.remnant;
  return death;
}

ew_death ew_core_collapse_metal_free(const ew_core_collapse *models, double mass, bool hypernova) {
  if (mass >= ew_yield_masses[0])
    return ew_core_collapse_of(models, mass, 0.0, hypernova);
  ew_death death = {.fate = EW_FATE_CORE_COLLAPSE};
  add_between(&death, 1.0, models->supernova, ew_locate(metal_free_masses, 1 + EW_YIELD_MASSES, mass));
  death.ejected = mass - death.remnant;
  return death;
}

double ew_wind_share(const ew_core_collapse *models, double mass, double metal_fraction) {
  ew_place place = ew_locate(ew_yield_masses, EW_YIELD_MASSES, mass);
  ew_place z = ew_locate(ew_yield_metals, EW_YIELD_METALLICITIES, metal_fraction);
  const double *poor = &models->wind_share[z.index * EW_YIELD_MASSES + place.index];
  const double *rich = poor + EW_YIELD_MASSES;
  return ew_between(ew_between(poor[0], poor[1], place.weight), ew_between(rich[0], rich[1], place.weight), z.weight);
}
