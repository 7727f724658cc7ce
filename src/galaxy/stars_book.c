/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Books kept of stars: one event per slot (abundances, time), one component (sizes), cohorts that age together. */
#include "galaxy/state.h"

#include <math.h>

#define TRACE 1e-9 /* of solar: less of an element is what rounding leaves when a wind takes all metals */

ew_star_event *ew_event_of_slot(ew_step *step, bool metal_free) {
  ew_galaxy *galaxy = step->galaxy;
  ew_star_event *event = ew_arena_take(galaxy->arena, sizeof *event);
  if (!galaxy->born_here) {
    galaxy->born_here = ew_arena_take(galaxy->arena, sizeof *galaxy->born_here);
    if (galaxy->born_here) {
      galaxy->born_here->next = galaxy->component;
      galaxy->component = galaxy->born_here;
    }
  }
  if (!event || !galaxy->born_here) {
    step->short_of_memory = true;
    return NULL;
  }
  event->component = galaxy->born_here;
  event->branch = galaxy->branch;
  event->time = 0.5 * (step->start + step->end);
  event->metal_free = metal_free;
  event->next = galaxy->event;
  galaxy->event = event;
  if (!galaxy->last_event)
    galaxy->last_event = event;
  return event;
}

static double running_mean(double mean, double weight, double value, double added) {
  return mean + (value - mean) * added / (weight + added);
}

void ew_event_add(ew_star_event *event, double mass, const ew_composition *fraction) {
  double metals = ew_composition_metals(fraction);
  event->metal_fraction = running_mean(event->metal_fraction, event->mass, metals, mass);
  event->mass += mass;
  if (!(fraction->mass[EW_IRON] > TRACE * ew_solar.mass[EW_IRON]) || event->metal_free)
    return;
  double iron = ew_abundance(fraction, EW_IRON, EW_HYDROGEN), weight = event->iron_mass;
  event->iron = running_mean(event->iron, weight, iron, mass);
  event->iron_square = running_mean(event->iron_square, weight, iron * iron, mass);
  ew_composition held = *fraction;
  for (int i = EW_HELIUM + 1; i < EW_ELEMENT_COUNT; i++) {
    held.mass[i] = fmax(held.mass[i], TRACE * ew_solar.mass[i]);
    event->ratio[i] = running_mean(event->ratio[i], weight, ew_abundance(&held, (ew_element)i, EW_IRON), mass);
  }
  event->iron_mass += mass;
}

static bool make_cohorts(ew_galaxy *galaxy, const ew_calendar *calendar) {
  galaxy->cohort_count = (size_t)(calendar->end / EW_COHORT_SPAN) + 1;
  galaxy->cohort = ew_arena_take(galaxy->arena, galaxy->cohort_count * sizeof *galaxy->cohort);
  return galaxy->cohort != NULL;
}

void ew_cohort_add(ew_step *step, double mass, const ew_composition *fraction) {
  ew_galaxy *galaxy = step->galaxy;
  if (!galaxy->cohort && !make_cohorts(galaxy, step->environment->calendar)) {
    step->short_of_memory = true;
    return;
  }
  double time = 0.5 * (step->start + step->end);
  ew_cohort *cohort = &galaxy->cohort[(size_t)(time / EW_COHORT_SPAN)];
  cohort->time = running_mean(cohort->time, cohort->mass, time, mass);
  cohort->mass += mass;
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    cohort->formed.mass[i] += mass * fraction->mass[i];
}

/* Stars are born with the radius of the disc as it stands. Gas that turned into stars is no change that others would
 * respond to. */
void ew_component_add(ew_step *step, double mass, double radius) {
  ew_galaxy *galaxy = step->galaxy;
  ew_component *born = galaxy->born_here;
  born->radius = running_mean(born->radius, born->mass, radius, mass);
  born->mass += mass;
  if (galaxy->formed == 0.0) {
    galaxy->response_gas = ew_gas_in_galaxy(galaxy) + mass;
    galaxy->response_scale = ew_disc_half_mass_radius(galaxy, step->environment);
  }
  galaxy->response_gas -= mass;
  galaxy->response_stars += mass;
  galaxy->formed += mass;
  if (galaxy->event->metal_free)
    galaxy->formed_metal_free += mass;
  galaxy->last_formed_at = step->end;
}

double ew_stellar_mass(const ew_galaxy *galaxy) {
  return ew_ledger_mass(&galaxy->ledger, EW_LIVING_STARS) + ew_ledger_mass(&galaxy->ledger, EW_REMNANTS);
}
