/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Reionization and the gas supply. What a halo may hold is the mean baryon fraction times a share that falls below a
 * characteristic mass; what it takes in is the difference to all that it and everything that joined it ever took in.
 * So the supply does not depend on how finely the tree resolves its branches. Gas already inside small haloes
 * evaporates once the patch is ionized. */
#include "galaxy/state.h"

#include <math.h>

#define ROW(field) offsetof(ew_reionization_parameters, field)

static const ew_choice suppressions[] = {
    {"none", "haloes hold the mean baryon fraction", "limit"},
    {"characteristic_mass", "share of the mean that falls below a characteristic mass",
     "Okamoto, Gao & Theuns 2008, MNRAS 390, 920; Gnedin 2000, ApJ 542, 535"},
    {NULL, NULL, NULL},
};

const ew_parameter ew_reionization_rows[] = {
    {.name = "reionization.suppression",
     .type = EW_CHOICE,
     .offset = ROW(suppression),
     .unit = "",
     .standard = "\"characteristic_mass\"",
     .choices = suppressions,
     .meaning = "how the ionizing background limits the gas that haloes hold",
     .source = "Okamoto, Gao & Theuns 2008, MNRAS 390, 920"},
    {.name = "reionization.redshift",
     .type = EW_REAL,
     .offset = ROW(redshift),
     .unit = "1",
     .standard = "7.7",
     .low = 5,
     .high = 15,
     .meaning = "mean redshift at which a patch is ionized",
     .source = "Planck 2018 VI, mid-point 7.67 +- 0.73"},
    {.name = "reionization.redshift_scatter",
     .type = EW_REAL,
     .offset = ROW(redshift_scatter),
     .unit = "1",
     .standard = "1",
     .low = 0,
     .high = 3,
     .meaning = "standard deviation of that redshift between patches",
     .source = "own choice: simulated scatter over a Local Group region is 1 to 2"},
    {.name = "reionization.sharpness",
     .type = EW_REAL,
     .offset = ROW(sharpness),
     .unit = "1",
     .standard = "2",
     .low = 0.5,
     .high = 4,
     .meaning = "alpha of the share that a halo can hold",
     .source = "Okamoto, Gao & Theuns 2008: 2; Gnedin 2000: 1"},
    {.name = "reionization.evaporation",
     .type = EW_FLAG,
     .offset = ROW(evaporation),
     .unit = "",
     .standard = "true",
     .meaning = "gas inside small haloes leaves once the patch is ionized",
     .source = "after Shapiro, Iliev & Raga 2004, MNRAS 348, 753"},
    {.name = "reionization.evaporation_velocity",
     .type = EW_REAL,
     .offset = ROW(evaporation_velocity),
     .unit = "km/s",
     .standard = "20",
     .low = 0,
     .high = 50,
     .meaning = "haloes of smaller virial velocity lose their gas",
     .source = "own choice, after Iliev, Shapiro & Raga 2005, MNRAS 361, 405"},
    {.name = "reionization.evaporation_speed",
     .type = EW_REAL,
     .offset = ROW(evaporation_speed),
     .unit = "km/s",
     .standard = "10",
     .low = 1,
     .high = 50,
     .meaning = "speed at which evaporating gas crosses the virial radius",
     .source = "sound speed of photo-ionized gas, common practice"},
    {.name = NULL},
};

const ew_process_record ew_reionization_process = {
    .name = "reionization",
    .meaning = "limits the gas supply of small haloes and evaporates their gas",
    .source = "Okamoto, Gao & Theuns 2008, MNRAS 390, 920",
    .rows = ew_reionization_rows,
};

double ew_baryon_share(const ew_reionization_parameters *parameters, double mass, double characteristic_mass) {
  if (!(characteristic_mass > 0.0))
    return 1.0;
  double a = parameters->sharpness, ratio = characteristic_mass / mass;
  if (a == 2.0) {
    double base = 1.0 + (cbrt(4.0) - 1.0) * ratio * ratio;
    return 1.0 / (base * sqrt(base));
  }
  return pow(1.0 + (exp2(a / 3.0) - 1.0) * pow(ratio, a), -3.0 / a);
}

/* Closed form within 8 per cent of the paper's table for reionization at z = 9; for other redshifts the turn-on moves
 * along (own choice). */
double ew_characteristic_mass(double hubble, double redshift, double reionization_redshift) {
  double turn_on = redshift / (reionization_redshift - 0.63);
  double switched = turn_on < 0.6 ? 1.0 : exp(-pow(turn_on, 17.6));
  return 6.5e9 / hubble * exp(-0.604 * redshift) * switched;
}

ew_composition ew_external_gas(const ew_world *world, double mass, double metal_fraction) {
  ew_composition gas;
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    gas.mass[i] =
        mass * ((1.0 - metal_fraction) * ew_primordial.mass[i] + metal_fraction * world->external_metals.mass[i]);
  return gas;
}

/* Metals in what flows in at this step. */
static double inflow_metals(const ew_step *step) {
  const ew_environment *e = step->environment;
  if (!e->model->gas.external_enrichment)
    return 0.0;
  bool enriched = ew_step_reionized(step) || e->redshift < step->galaxy->luck.enrichment_redshift;
  return enriched ? step->galaxy->luck.external_metals : 0.0;
}

void ew_take_in_gas(ew_step *step) {
  const ew_environment *e = step->environment;
  ew_galaxy *galaxy = step->galaxy;
  galaxy->supply = 0.0;
  step->share = ew_baryon_share(&e->model->reionization, e->halo.mass, e->patch->characteristic_mass[e->slot]);
  if (e->satellite)
    return;
  double may_hold = ew_baryon_fraction(e->world->cosmology) * step->share * e->halo.mass;
  double inflow = may_hold - galaxy->baryons;
  if (!(inflow > 0.0))
    return;
  ew_composition gas = ew_external_gas(e->world, inflow, inflow_metals(step));
  ew_ledger_move(&galaxy->ledger, EW_OUTSIDE, EW_HALO_GAS, &gas);
  galaxy->baryons = may_hold;
  galaxy->supply = inflow;
}

void ew_evaporate_gas(ew_step *step) {
  const ew_environment *e = step->environment;
  const ew_reionization_parameters *p = &e->model->reionization;
  if (!p->evaporation || !ew_step_reionized(step) || e->virial_velocity >= p->evaporation_velocity)
    return;
  double share = ew_step_decay(step, e->halo.radius / (p->evaporation_speed * EW_KMS_IN_KPC_GYR));
  ew_ledger *ledger = &step->galaxy->ledger;
  ew_ledger_move_share(ledger, EW_HALO_GAS, EW_LOST_GAS, share);
  ew_ledger_move_share(ledger, EW_DISC_GAS, EW_LOST_GAS, share);
  ew_ledger_move_share(ledger, EW_HEATED_GAS, EW_LOST_GAS, share);
  ew_release_supernovae(step->galaxy, share);
}
