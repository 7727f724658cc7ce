/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Winds: each supernova drives gas out of the galaxy, as much as the loading law of Muratov et al. 2015 says, but no
 * more than its energy can lift out of the halo and no more than a cap. */
#include "galaxy/state.h"

#include <math.h>

#define ROW(field) offsetof(ew_feedback_parameters, field)

const ew_parameter ew_feedback_rows[] = {
    {.name = "feedback.loading_scale",
     .type = EW_REAL,
     .offset = ROW(loading_scale),
     .unit = "1",
     .standard = "2.9",
     .low = 0,
     .high = 100,
     .meaning = "gas blown out over stars formed at a virial velocity of 60 km/s today; 0: no winds",
     .source = "Muratov et al. 2015, MNRAS 454, 2691, eqs 4-5, from memory"},
    {.name = "feedback.loading_max",
     .type = EW_REAL,
     .offset = ROW(loading_max),
     .unit = "1",
     .standard = "1000",
     .low = 0,
     .high = 1e5,
     .meaning = "the loading law is cut here",
     .source = "own choice"},
    {.name = "feedback.energy_share",
     .type = EW_REAL,
     .offset = ROW(energy_share),
     .unit = "1",
     .standard = "0.1",
     .low = 0,
     .high = 1,
     .meaning = "share of the energy of supernovae (2.5e51 erg in the mean, as half of the heaviest are hypernovae) "
                "that lifts gas; below 40 km/s this, not the loading law, sets the wind",
     .source = "own choice: resolved winds carry some 0.1 of 1e51 erg (Kim et al. 2020, ApJ 900, 61, from memory)"},
    {.name = "feedback.metal_loading",
     .type = EW_REAL,
     .offset = ROW(metal_loading),
     .unit = "1",
     .standard = "1",
     .low = 0,
     .high = 10,
     .meaning = "metallicity of the wind over that of the gas",
     .source = "own choice: 0.5 to 3"},
    {.name = NULL},
};

const ew_process_record ew_feedback_process = {
    .name = "feedback",
    .meaning = "supernova winds",
    .source = "Muratov et al. 2015, MNRAS 454, 2691",
    .rows = ew_feedback_rows,
};

#define PIVOT_VELOCITY   60.0 /* km/s */
#define HIGHEST_REDSHIFT 4.0  /* up to which the law was calibrated */

/* Wind mass over mass of stars formed. */
static double loading(const ew_feedback_parameters *p, double velocity, double redshift) {
  double z = fmin(redshift, HIGHEST_REDSHIFT), slope = velocity < PIVOT_VELOCITY ? -3.2 : -1.0;
  double law = p->loading_scale * pow(1.0 + z, 1.3) * pow(velocity / PIVOT_VELOCITY, slope);
  return fmin(law, p->loading_max);
}

/* Gas that the supernovae of this step blow out, Msun. */
static double wind_mass(const ew_step *step) {
  const ew_environment *e = step->environment;
  const ew_feedback_parameters *p = &e->model->feedback;
  double formed = step->supernovae / ew_supernovae_per_mass(e->world->stars);
  double escape = ew_nfw_escape_velocity(&e->halo);
  double by_energy = 2.0 * p->energy_share * step->energy * EW_SUPERNOVA_ENERGY / (escape * escape);
  return fmin(formed * loading(p, e->virial_velocity, e->redshift), by_energy);
}

/* Share of the metals in a wind that takes that share of the gas: thin winds one after the other, each as rich over the
 * gas as the metal loading says. So it does not depend on the time step, and no metals stay without gas. */
static double metal_share(double share, double metal_loading) {
  return share < 1.0 ? 1.0 - pow(1.0 - share, metal_loading) : 1.0;
}

/* Blows out that share of a reservoir, metals included; a wind poor in metals is the lighter for it. */
static void blow(ew_ledger *ledger, ew_reservoir from, double share, double metals_share) {
  const ew_composition *gas = &ledger->in[from];
  double metals = ew_composition_metals(gas), light = ew_composition_mass(gas) - metals;
  if (!(light > 0.0))
    return;
  double light_share = fmin(fmax((share * (light + metals) - metals_share * metals) / light, 0.0), share);
  ew_composition out;
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    out.mass[i] = gas->mass[i] * (i > EW_HELIUM ? metals_share : light_share);
  ew_ledger_move(ledger, from, EW_EJECTED_GAS, &out);
}

void ew_blow_wind(ew_step *step) {
  ew_galaxy *galaxy = step->galaxy;
  double gas = ew_gas_in_galaxy(galaxy);
  if (!(step->supernovae > 0.0 && gas > 0.0))
    return;
  double share = fmin(wind_mass(step) / gas, 1.0);
  double metals_share = metal_share(share, step->environment->model->feedback.metal_loading);
  blow(&galaxy->ledger, EW_DISC_GAS, share, metals_share);
  blow(&galaxy->ledger, EW_HEATED_GAS, share, metals_share);
  ew_release_supernovae(galaxy, metals_share);
}
