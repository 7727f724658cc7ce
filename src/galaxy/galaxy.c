/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A galaxy: made, advanced slot by slot through the processes in their order, and joined by what falls in. */
#include "galaxy/state.h"

#include <math.h>

#define NEGLIGIBLE_GAS  1.0 /* Msun: a galaxy with less, and no supply, is idle */
#define LEAST_GAS_SHARE 0.1 /* of the stellar mass: galaxies with less gas count as cut off */

ew_world ew_world_of(const ew_cosmology *cosmology, const ew_concentration *concentration, const ew_stars *stars) {
  const double metal_poor = 1e-3;
  ew_world world = {cosmology, concentration, stars, {{0}}};
  double total = 0.0;
  for (int bin = 0; bin < EW_SUPERNOVA_BINS; bin++) {
    ew_death death = ew_supernova_bin_death(stars, bin, metal_poor);
    for (int i = EW_HELIUM + 1; i < EW_ELEMENT_COUNT; i++) {
      double made = ew_supernova_bin_number(stars, bin) * death.made.mass[i];
      world.external_metals.mass[i] += made;
      total += made;
    }
  }
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    world.external_metals.mass[i] /= total;
  return world;
}

void ew_environment_set_halo(ew_environment *environment, double mass, double concentration_factor) {
  const ew_world *world = environment->world;
  double radius = environment->calendar->radius[environment->slot] * cbrt(mass);
  double median = ew_concentration_at(world->concentration, mass, environment->redshift);
  environment->halo = (ew_nfw){mass, radius, fmax(median * concentration_factor, 1.0)};
  environment->virial_velocity = sqrt(EW_GRAVITY * mass / radius);
}

double ew_step_decay(const ew_step *step, double time_scale) {
  return -expm1(-ew_step_length(step) / time_scale);
}

ew_stream ew_step_stream(const ew_step *step, ew_process process, ew_draw_purpose purpose) {
  const ew_environment *e = step->environment;
  return ew_stream_open(e->draws, process, step->galaxy->branch,
                        (uint64_t)e->slot * EW_DRAW_PURPOSES + (uint64_t)purpose);
}

ew_galaxy *ew_galaxy_new(ew_arena *arena, uint64_t branch_key, const ew_branch_luck *luck) {
  ew_galaxy *galaxy = ew_arena_take(arena, sizeof *galaxy);
  if (!galaxy)
    return NULL;
  galaxy->arena = arena;
  galaxy->branch = branch_key;
  galaxy->luck = *luck;
  galaxy->last_merger_redshift = NAN;
  galaxy->last_formed_at = -INFINITY;
  return galaxy;
}

void ew_galaxy_receive(ew_galaxy *galaxy, const ew_received *received, const ew_world *world) {
  ew_composition gas = ew_external_gas(world, received->gas, received->metal_fraction);
  ew_ledger_move(&galaxy->ledger, EW_OUTSIDE, EW_HALO_GAS, &gas);
  galaxy->baryons += received->baryons;
}

double ew_galaxy_baryons(const ew_galaxy *galaxy) {
  return galaxy->baryons;
}

bool ew_galaxy_has_stars(const ew_galaxy *galaxy) {
  return galaxy->formed > 0.0;
}

bool ew_galaxy_is_idle(const ew_galaxy *galaxy) {
  return galaxy->idle;
}

const ew_ledger *ew_galaxy_ledger(const ew_galaxy *galaxy) {
  return &galaxy->ledger;
}

uint64_t ew_galaxy_branch(const ew_galaxy *galaxy) {
  return galaxy->branch;
}

const ew_branch_luck *ew_galaxy_luck(const ew_galaxy *galaxy) {
  return &galaxy->luck;
}

/* Hands a reservoir of one galaxy over to another's: outside for the one, from outside for the other. */
static void hand_over(ew_galaxy *from, ew_galaxy *to, ew_reservoir out, ew_reservoir in) {
  ew_composition all = from->ledger.in[out];
  ew_ledger_move(&from->ledger, out, EW_OUTSIDE, &all);
  ew_ledger_move(&to->ledger, EW_OUTSIDE, in, &all);
}

void ew_galaxy_fall_in(ew_galaxy *host, ew_galaxy *satellite) {
  hand_over(satellite, host, EW_HALO_GAS, EW_HALO_GAS);
  hand_over(satellite, host, EW_EJECTED_GAS, EW_EJECTED_GAS);
  host->baryons += satellite->baryons;
}

void ew_galaxy_dissolve(ew_galaxy *host, ew_galaxy *satellite) {
  hand_over(satellite, host, EW_DISC_GAS, EW_HALO_GAS);
  hand_over(satellite, host, EW_HEATED_GAS, EW_HALO_GAS);
  ew_galaxy_fall_in(host, satellite);
}

/* After reionization, only galaxies with gas to mix it with keep the gas that their stars give back. */
static bool keeps_stellar_gas(const ew_step *step) {
  const ew_galaxy *galaxy = step->galaxy;
  return !ew_step_reionized(step) || ew_gas_in_galaxy(galaxy) > LEAST_GAS_SHARE * ew_stellar_mass(galaxy);
}

static double gas_within_reach(const ew_galaxy *galaxy) {
  return ew_gas_in_galaxy(galaxy) + ew_ledger_mass(&galaxy->ledger, EW_HALO_GAS) +
         ew_ledger_mass(&galaxy->ledger, EW_EJECTED_GAS);
}

/* Once the patch is ionized, a galaxy without gas, supply and young stars waits for either to come. */
static bool falls_idle(const ew_step *step) {
  const ew_galaxy *galaxy = step->galaxy;
  return ew_step_reionized(step) && !(galaxy->supply > 0.0) && gas_within_reach(galaxy) < NEGLIGIBLE_GAS &&
         step->start > galaxy->last_formed_at + EW_PENDING_SPAN && !keeps_stellar_gas(step);
}

static void fall_idle(ew_step *step) {
  static const ew_reservoir left[] = {EW_HALO_GAS, EW_DISC_GAS, EW_HEATED_GAS, EW_EJECTED_GAS};
  for (size_t i = 0; i < sizeof left / sizeof left[0]; i++)
    ew_ledger_move_share(&step->galaxy->ledger, left[i], EW_LOST_GAS, 1.0);
  ew_release_supernovae(step->galaxy, 1.0);
  step->galaxy->idle = true;
}

void ew_galaxy_settle(ew_galaxy *galaxy, const ew_environment *environment) {
  double now = ew_calendar_end_of(environment->calendar, environment->slot);
  ew_step step = {.galaxy = galaxy, .environment = environment, .start = now, .end = now};
  ew_age_stars(&step, !galaxy->idle && keeps_stellar_gas(&step), true);
}

ew_status ew_galaxy_advance(ew_galaxy *galaxy, const ew_environment *environment, double t0, double t1,
                            ew_error *error) {
  ew_step step = {.galaxy = galaxy, .environment = environment, .start = t0, .end = t1};
  ew_take_in_gas(&step);
  if (galaxy->idle && !(gas_within_reach(galaxy) > 0.0))
    return EW_OK;
  if (galaxy->idle)
    ew_galaxy_settle(galaxy, environment);
  galaxy->idle = false;
  ew_evaporate_gas(&step);
  ew_cycle_gas(&step);
  ew_explode_supernovae(&step);
  ew_age_stars(&step, keeps_stellar_gas(&step), false);
  ew_respond_slowly(&step);
  ew_blow_wind(&step);
  ew_respond_fast(&step);
  ew_form_stars(&step);
  if (falls_idle(&step))
    fall_idle(&step);
  return step.short_of_memory ? ew_fail_memory(error, "a galaxy") : EW_OK;
}
