/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Infall, life as a member, and mergers. Members of members come along and are advanced with the rest; they keep
 * orbiting the galaxy that they came with until either merges. */
#include "population/evolution.h"

static ew_member *new_member(ew_evolution *evolution, const ew_branch *branch, ew_galaxy *galaxy) {
  ew_member *member = ew_arena_take(evolution->arena, sizeof *member);
  if (!member)
    return NULL;
  const ew_environment *host = &evolution->environment;
  double mass = evolution->tree->mass[branch->first_node + branch->node_count - 1];
  double factor = galaxy ? ew_galaxy_luck(galaxy)->concentration_factor
                         : ew_branch_luck_draw(evolution->model, evolution->draws, branch->key).concentration_factor;
  ew_environment own = *host;
  ew_environment_set_halo(&own, mass, factor);
  member->galaxy = galaxy;
  member->halo = own.halo;
  member->mass_ratio = mass / host->halo.mass;
  member->branch = branch;
  return member;
}

static void set_orbit(const ew_environment *host, ew_member *member, double now) {
  member->sinks_at = now + ew_sinking_time(host, member->halo.mass, member->branch->key, member->infalls++);
}

static ew_member **end_of(ew_member **list) {
  while (*list)
    list = &(*list)->next;
  return list;
}

/* The satellite's members follow it. */
static void bring_members(ew_household *home, ew_member *satellite, ew_member *members) {
  for (ew_member *m = members; m; m = m->next)
    if (!m->bound_to)
      m->bound_to = satellite;
  *end_of(&home->members) = satellite;
  satellite->next = members;
}

static ew_status admit_galaxy(ew_evolution *evolution, ew_household *home, const ew_branch *branch,
                              const ew_arrival *arrival, ew_error *error) {
  const ew_calendar *calendar = &evolution->laboratory->calendar;
  ew_member *satellite = new_member(evolution, branch, arrival->galaxy);
  if (!satellite)
    return ew_fail_memory(error, "a satellite");
  ew_galaxy_fall_in(home->galaxy, arrival->galaxy);
  double now = (double)evolution->environment.slot * calendar->step;
  set_orbit(&evolution->environment, satellite, now);
  bring_members(home, satellite, arrival->members);
  return EW_OK;
}

/* A starless halo is kept if it can heat the stars that the host will have when it arrives. */
static ew_status admit_dark(ew_evolution *evolution, ew_household *home, const ew_branch *branch, ew_error *error) {
  double mass = evolution->tree->mass[branch->first_node + branch->node_count - 1];
  double ratio = mass / evolution->environment.halo.mass;
  if (ratio < evolution->model->sizes.smallest_merger)
    return EW_OK;
  ew_member *halo = new_member(evolution, branch, NULL);
  if (!halo)
    return ew_fail_memory(error, "a satellite");
  double now = (double)evolution->environment.slot * evolution->laboratory->calendar.step;
  set_orbit(&evolution->environment, halo, now);
  *end_of(&home->members) = halo;
  return EW_OK;
}

ew_status ew_household_admit(ew_evolution *evolution, ew_household *home, size_t index, ew_error *error) {
  const ew_branch *branch = &evolution->tree->branch[index];
  ew_arrival *arrival = &evolution->arrival[index];
  if (arrival->galaxy && (ew_galaxy_has_stars(arrival->galaxy) || arrival->members))
    return admit_galaxy(evolution, home, branch, arrival, error);
  if (arrival->galaxy) {
    ew_galaxy_dissolve(home->galaxy, arrival->galaxy);
    ew_ledger_add(&evolution->gone, ew_galaxy_ledger(arrival->galaxy));
    arrival->galaxy = NULL;
  } else {
    double metals = arrival->gas > 0.0 ? arrival->gas_metals / arrival->gas : 0.0;
    ew_galaxy_receive(home->galaxy, &(ew_received){arrival->baryons, arrival->gas, metals},
                      &evolution->laboratory->world);
  }
  return admit_dark(evolution, home, branch, error);
}

ew_environment ew_member_environment(const ew_evolution *evolution, const ew_member *member) {
  ew_environment environment = evolution->environment;
  environment.satellite = true;
  environment.halo = member->halo;
  environment.virial_velocity = ew_nfw_circular_velocity(&member->halo, member->halo.radius);
  return environment;
}

ew_status ew_household_advance(ew_evolution *evolution, ew_household *home, double t0, double t1, ew_error *error) {
  ew_status status = ew_galaxy_advance(home->galaxy, &evolution->environment, t0, t1, error);
  for (ew_member *m = home->members; m && status == EW_OK; m = m->next) {
    if (!m->galaxy || ew_galaxy_is_idle(m->galaxy))
      continue;
    ew_environment environment = ew_member_environment(evolution, m);
    status = ew_galaxy_advance(m->galaxy, &environment, t0, t1, error);
  }
  return status;
}

/* Those that orbited the member orbit what it merges with, on new orbits. */
static void hand_on_members(const ew_environment *host, ew_household *home, const ew_member *gone, double now) {
  for (ew_member *m = home->members; m; m = m->next) {
    if (m->bound_to != gone)
      continue;
    m->bound_to = gone->bound_to;
    m->mass_ratio = m->halo.mass / host->halo.mass;
    set_orbit(host, m, now);
  }
}

static ew_status merge(ew_evolution *evolution, ew_household *home, ew_member *gone, double now, ew_error *error) {
  ew_member *target = gone->bound_to;
  ew_environment host = target ? ew_member_environment(evolution, target) : evolution->environment;
  ew_merger merger = {host.halo, gone->halo, host.redshift, gone->mass_ratio};
  ew_galaxy *galaxy = target ? target->galaxy : home->galaxy;
  ew_status status = ew_galaxy_merge(galaxy, gone->galaxy, &merger, &host, error);
  hand_on_members(&host, home, gone, now);
  return status;
}

ew_status ew_household_merge(ew_evolution *evolution, ew_household *home, double now, ew_error *error) {
  ew_status status = EW_OK;
  for (ew_member **link = &home->members; *link && status == EW_OK;) {
    ew_member *member = *link;
    if (member->sinks_at > now) {
      link = &member->next;
      continue;
    }
    *link = member->next;
    status = merge(evolution, home, member, now, error);
  }
  return status;
}
