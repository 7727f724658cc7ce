/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The gas cycle: halo gas joins the disc after a free-fall time if the halo is above the cooling threshold; gas that
 * young stars heated comes back to the disc; ejected gas returns slowly to massive haloes and never to small ones after
 * reionization. Above the threshold no cooling function is used: gas in haloes below 1e11 Msun cools within a free
 * fall. */
#include "galaxy/state.h"

#include <math.h>

#define ROW(field) offsetof(ew_gas_parameters, field)

const ew_parameter ew_gas_rows[] = {
    {.name = "gas.delay",
     .type = EW_REAL,
     .offset = ROW(delay),
     .unit = "Gyr",
     .standard = "0",
     .low = 0,
     .high = 5,
     .meaning = "e-folding time in which gas joins the disc, if longer than the free-fall time",
     .source = "own choice"},
    {.name = "gas.return_time",
     .type = EW_REAL,
     .offset = ROW(return_time),
     .unit = "Gyr",
     .standard = "18",
     .low = 0.1,
     .high = 1e4,
     .meaning = "time for ejected gas to return to a halo of 1e10 Msun; inversely with mass elsewhere",
     .source = "Henriques et al. 2013, MNRAS 431, 3373, from memory"},
    {.name = "gas.return_velocity",
     .type = EW_REAL,
     .offset = ROW(return_velocity),
     .unit = "km/s",
     .standard = "15",
     .low = 0,
     .high = 50,
     .meaning = "after reionization haloes of smaller virial velocity lose ejected gas for good",
     .source = "own choice"},
    {.name = "gas.external_enrichment",
     .type = EW_FLAG,
     .offset = ROW(external_enrichment),
     .unit = "",
     .standard = "true",
     .meaning =
         "gas may arrive with metals of other galaxies: with a chance that grows to z = 6, always after reionization",
     .source = "own choice"},
    {.name = "gas.external_metallicity",
     .type = EW_REAL,
     .offset = ROW(external_metallicity),
     .unit = "dex",
     .standard = "-3.5",
     .low = -7,
     .high = -1,
     .meaning = "median log10 of the metal mass fraction over solar in such gas",
     .source = "own choice"},
    {.name = "gas.external_scatter",
     .type = EW_REAL,
     .offset = ROW(external_scatter),
     .unit = "dex",
     .standard = "0.5",
     .low = 0,
     .high = 2,
     .meaning = "its scatter between branches",
     .source = "own choice"},
    {.name = NULL},
};

const ew_process_record ew_gas_process = {
    .name = "gas",
    .meaning = "gas joins the disc, and what was ejected returns or is lost",
    .source = "Henriques et al. 2013, MNRAS 431, 3373, for the return time",
    .rows = ew_gas_rows,
};

static bool recovering(const ew_step *step) {
  return step->start < step->galaxy->recovers_at;
}

static void return_heated(ew_step *step) {
  double share = ew_step_decay(step, step->environment->model->star_formation.heated_time);
  ew_ledger_move_share(&step->galaxy->ledger, EW_HEATED_GAS, EW_DISC_GAS, share);
}

static void return_ejected(ew_step *step) {
  const ew_environment *e = step->environment;
  ew_ledger *ledger = &step->galaxy->ledger;
  if (ew_step_reionized(step) && (e->satellite || e->virial_velocity < e->model->gas.return_velocity)) {
    ew_ledger_move_share(ledger, EW_EJECTED_GAS, EW_LOST_GAS, 1.0);
    return;
  }
  double time_scale = e->model->gas.return_time * 1e10 / e->halo.mass;
  ew_ledger_move_share(ledger, EW_EJECTED_GAS, EW_HALO_GAS, step->share * ew_step_decay(step, time_scale));
}

static void cool(ew_step *step) {
  const ew_environment *e = step->environment;
  if (e->halo.mass < e->patch->threshold_mass[e->slot])
    return;
  double time_scale = fmax(e->calendar->free_fall[e->slot], e->model->gas.delay);
  ew_ledger_move_share(&step->galaxy->ledger, EW_HALO_GAS, EW_DISC_GAS, ew_step_decay(step, time_scale));
}

void ew_cycle_gas(ew_step *step) {
  return_ejected(step);
  if (recovering(step))
    return;
  return_heated(step);
  cool(step);
}

double ew_gas_in_galaxy(const ew_galaxy *galaxy) {
  return ew_ledger_mass(&galaxy->ledger, EW_DISC_GAS) + ew_ledger_mass(&galaxy->ledger, EW_HEATED_GAS);
}
