/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Massive stars die after their lifetimes: deaths wait in a ring of slots and act when their slot comes. */
#include "galaxy/state.h"

#include <math.h>
#include <string.h>

#define LEAST_DISTURBANCE 0.01 /* energy over that which empties the halo */

static size_t ring_size(const ew_calendar *calendar) {
  return (size_t)ceil(EW_PENDING_SPAN / calendar->step) + 2;
}

static bool make_ring(ew_galaxy *galaxy, const ew_calendar *calendar, size_t slot) {
  galaxy->pending_count = ring_size(calendar);
  galaxy->pending = ew_arena_take(galaxy->arena, galaxy->pending_count * sizeof *galaxy->pending);
  galaxy->pending_slot = slot;
  galaxy->pending_first = 0;
  return galaxy->pending != NULL;
}

/* The entry of a slot, which lies within the span. */
static ew_deaths *entry(ew_galaxy *galaxy, size_t slot) {
  size_t ahead = slot - galaxy->pending_slot;
  if (ahead >= galaxy->pending_count)
    ahead = galaxy->pending_count - 1;
  return &galaxy->pending[(galaxy->pending_first + ahead) % galaxy->pending_count];
}

static void add_deaths(ew_deaths *to, const ew_deaths *from) {
  to->count += from->count;
  to->energy += from->energy;
  to->first_star_count += from->first_star_count;
  to->first_star_energy += from->first_star_energy;
  for (int i = 0; i < EW_ELEMENT_COUNT; i++) {
    to->ejected.mass[i] += from->ejected.mass[i];
    to->remnant.mass[i] += from->remnant.mass[i];
    to->made.mass[i] += from->made.mass[i];
  }
}

static ew_deaths take_due(ew_galaxy *galaxy, size_t slot) {
  ew_deaths due = {0};
  while (galaxy->pending_slot <= slot) {
    ew_deaths *first = &galaxy->pending[galaxy->pending_first];
    add_deaths(&due, first);
    memset(first, 0, sizeof *first);
    galaxy->pending_first = (galaxy->pending_first + 1) % galaxy->pending_count;
    galaxy->pending_slot++;
  }
  return due;
}

/* Turns the ring of a galaxy that was idle to the slot; what was due before is due then. */
static void turn_to(ew_galaxy *galaxy, size_t slot) {
  if (galaxy->pending_slot >= slot)
    return;
  ew_deaths overdue = take_due(galaxy, slot - 1);
  add_deaths(entry(galaxy, slot), &overdue);
}

static ew_deaths deaths_of(const ew_dying *dying) {
  const ew_death *death = &dying->death;
  bool explodes = death->energy > 0.0;
  ew_deaths deaths = {.count = explodes ? dying->number : 0.0, .energy = dying->number * death->energy};
  if (dying->first_star) {
    deaths.first_star_count = deaths.count;
    deaths.first_star_energy = deaths.energy;
  }
  for (int i = 0; i < EW_ELEMENT_COUNT; i++) {
    deaths.ejected.mass[i] = dying->number * death->ejected * dying->fraction->mass[i];
    deaths.remnant.mass[i] = dying->number * death->remnant * dying->fraction->mass[i];
    deaths.made.mass[i] = dying->number * death->made.mass[i];
  }
  return deaths;
}

void ew_schedule_death(ew_step *step, const ew_dying *dying) {
  ew_galaxy *galaxy = step->galaxy;
  const ew_environment *e = step->environment;
  if (!galaxy->pending && !make_ring(galaxy, e->calendar, e->slot)) {
    step->short_of_memory = true;
    return;
  }
  turn_to(galaxy, e->slot);
  double time = 0.5 * (step->start + step->end) + dying->age;
  size_t slot = (size_t)(time / e->calendar->step);
  if (slot < galaxy->pending_slot)
    slot = galaxy->pending_slot; /* those of this slot have exploded already */
  ew_deaths deaths = deaths_of(dying);
  add_deaths(entry(galaxy, slot), &deaths);
}

/* Kinetic energy that would unbind the gas of the halo, Msun (km/s)^2: mass times virial velocity squared. */
static double binding_energy(const ew_step *step) {
  double gas = ew_gas_in_galaxy(step->galaxy) + ew_ledger_mass(&step->galaxy->ledger, EW_HALO_GAS);
  return gas * step->environment->virial_velocity * step->environment->virial_velocity;
}

/* First-star explosions either empty the halo or keep its gas hot for a while. A massive halo, which such a galaxy may
 * have merged with, does not notice. */
static void disturb_gas(ew_step *step, double energy) {
  const ew_first_star_parameters *p = &step->environment->model->first_stars;
  ew_galaxy *galaxy = step->galaxy;
  ew_ledger *ledger = &galaxy->ledger;
  double ratio = energy * EW_SUPERNOVA_ENERGY / fmax(binding_energy(step), 1e-300);
  double part = fmin(ratio / p->binding_factor, 1.0);
  if (part < LEAST_DISTURBANCE)
    return;
  ew_ledger_move_share(ledger, EW_DISC_GAS, EW_HEATED_GAS, 1.0);
  double wait = p->recovery_range[0] + part * (p->recovery_range[1] - p->recovery_range[0]);
  galaxy->recovers_at = fmax(galaxy->recovers_at, step->end + wait);
  if (ratio <= p->binding_factor)
    return;
  ew_ledger_move_share(ledger, EW_HEATED_GAS, EW_LOST_GAS, 1.0);
  ew_ledger_move_share(ledger, EW_HALO_GAS, EW_LOST_GAS, 1.0);
  ew_release_supernovae(galaxy, 1.0);
}

/* Makes elements out of others, at most of all that the gas has of those. */
static void make_elements(ew_ledger *ledger, ew_composition made) {
  double part = 1.0;
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    if (-made.mass[i] > ledger->in[EW_DISC_GAS].mass[i])
      part = fmin(part, ledger->in[EW_DISC_GAS].mass[i] / -made.mass[i]);
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    made.mass[i] *= part;
  ew_ledger_move(ledger, EW_MADE, EW_DISC_GAS, &made);
}

/* Ejecta and what was made reach the gas as one, so that what a star destroys is taken from what it gives back. A small
 * cluster may have drawn more massive stars than it has mass: then less is given back. */
static void enrich(ew_galaxy *galaxy, const ew_deaths *deaths) {
  ew_ledger_move(&galaxy->ledger, EW_LIVING_STARS, EW_REMNANTS, &deaths->remnant);
  ew_ledger_move(&galaxy->ledger, EW_LIVING_STARS, EW_DISC_GAS, &deaths->ejected);
  make_elements(&galaxy->ledger, deaths->made);
  ew_hold_supernovae(galaxy, deaths->count);
}

void ew_explode_supernovae(ew_step *step) {
  ew_galaxy *galaxy = step->galaxy;
  if (!galaxy->pending)
    return;
  ew_deaths due = take_due(galaxy, step->environment->slot);
  enrich(galaxy, &due);
  if (due.first_star_energy > 0.0)
    disturb_gas(step, due.first_star_energy);
  step->supernovae += due.count - due.first_star_count;
  step->energy += due.energy - due.first_star_energy;
}

bool ew_pending_join(ew_galaxy *galaxy, const ew_galaxy *other, const ew_calendar *calendar) {
  if (!other->pending)
    return true;
  if (!galaxy->pending && !make_ring(galaxy, calendar, other->pending_slot))
    return false;
  turn_to(galaxy, other->pending_slot);
  for (size_t k = 0; k < other->pending_count; k++) {
    size_t slot = other->pending_slot + k;
    const ew_deaths *deaths = &other->pending[(other->pending_first + k) % other->pending_count];
    add_deaths(entry(galaxy, slot > galaxy->pending_slot ? slot : galaxy->pending_slot), deaths);
  }
  return true;
}
