/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Mergers, with galaxies or starless haloes, puff up the stars: the balance of energy of Cole et al. 2000, MNRAS 319,
 * 168, eq. 4.22, between all masses inside the half-mass radius of the one and inside the tidally limited other, dark
 * matter included. Stars of the satellite that are torn off on the way stay where the host is as dense as they were. */
#include "galaxy/state.h"

#include <math.h>

#define ROW(field) offsetof(ew_size_parameters, field)

const ew_parameter ew_size_rows[] = {
    {.name = "sizes.birth_factor",
     .type = EW_REAL,
     .offset = ROW(birth_factor),
     .unit = "1",
     .standard = "1",
     .low = 0.05,
     .high = 5,
     .meaning = "factor on the size of the gas disc that follows from spin, and so on the size of what is born in it",
     .source = "Mo, Mao & White 1998, MNRAS 295, 319, with spin of Bullock et al. 2001"},
    {.name = "sizes.gas_response",
     .type = EW_FLAG,
     .offset = ROW(gas_response),
     .unit = "",
     .standard = "true",
     .meaning = "stars respond to gas that comes and goes",
     .source = "Hills 1980, ApJ 235, 986"},
    {.name = "sizes.merger_growth",
     .type = EW_FLAG,
     .offset = ROW(merger_growth),
     .unit = "",
     .standard = "true",
     .meaning = "mergers make the stars' distribution wider",
     .source = "Cole et al. 2000, MNRAS 319, 168"},
    {.name = "sizes.orbital_share",
     .type = EW_REAL,
     .offset = ROW(orbital_share),
     .unit = "1",
     .standard = "1",
     .low = 0,
     .high = 2,
     .meaning = "orbital energy at the merger, in units of that of a circular orbit at r1 + r2",
     .source = "Cole et al. 2000, MNRAS 319, 168"},
    {.name = "sizes.binding_share",
     .type = EW_REAL,
     .offset = ROW(binding_share),
     .unit = "1",
     .standard = "0.5",
     .low = 0.2,
     .high = 1,
     .meaning = "form factor of the binding energy G M^2/r",
     .source = "Cole et al. 2000, MNRAS 319, 168"},
    {.name = "sizes.smallest_merger",
     .type = EW_REAL,
     .offset = ROW(smallest_merger),
     .unit = "1",
     .standard = "0.02",
     .low = 1e-3,
     .high = 1,
     .meaning = "starless haloes below this mass ratio at infall leave the sizes alone",
     .source = "own choice"},
    {.name = NULL},
};

const ew_process_record ew_size_process = {
    .name = "sizes",
    .meaning = "where stars are born, and how mergers and gas move them",
    .source = "Cole et al. 2000, MNRAS 319, 168",
    .rows = ew_size_rows,
};

#define COUNTED_RATIO (1.0 / 20.0) /* of halo masses: mergers that the catalogue counts */

static double mean_density(double mass, double radius) {
  return mass / (4.0 / 3.0 * EW_PI * radius * radius * radius);
}

typedef struct {
  double mass, radius;
} body;

static double merged_radius(const ew_size_parameters *p, const body *one, const body *two) {
  double total = one->mass + two->mass;
  double energy = one->mass * one->mass / one->radius + two->mass * two->mass / two->radius +
                  p->orbital_share / p->binding_share * one->mass * two->mass / (one->radius + two->radius);
  return total * total / energy;
}

/* The part of the satellite that reaches the centre: what is denser than the host's stars. */
static body surviving_core(const ew_nfw *satellite, double density) {
  double radius = ew_nfw_radius_of_density(satellite, density);
  return (body){ew_nfw_mass(satellite, radius), radius};
}

/* Lays the satellite's stars down: those of its dense core with the merged stars, others where the host is as dense. */
static void lay_down(const ew_merger *merger, ew_galaxy *satellite, double core_radius, double merged) {
  for (ew_component *c = satellite->component; c; c = c->next) {
    if (!(c->mass > 0.0))
      continue;
    double density = mean_density(ew_nfw_mass(&merger->satellite, c->radius), c->radius);
    double torn_at = ew_nfw_radius_of_density(&merger->host, density);
    c->radius = c->radius <= core_radius ? merged : fmax(merged, torn_at);
  }
}

static void grow(ew_galaxy *host, ew_galaxy *satellite, const ew_merger *merger, const ew_environment *environment) {
  double radius = ew_half_mass_radius(host);
  if (!(radius > 0.0) || !environment->model->sizes.merger_growth)
    return;
  body one = {ew_mass_inside(host, environment, radius), radius};
  body two = surviving_core(&merger->satellite, mean_density(one.mass, one.radius));
  double merged = fmax(merged_radius(&environment->model->sizes, &one, &two), radius);
  if (satellite)
    lay_down(merger, satellite, two.radius, merged);
  ew_scale_components(host, merged / radius);
}

static void join_components(ew_galaxy *host, ew_galaxy *satellite) {
  ew_component **tail = &host->component;
  while (*tail)
    tail = &(*tail)->next;
  *tail = satellite->component;
  ew_limit_components(host);
}

static void join_events(ew_galaxy *host, ew_galaxy *satellite) {
  if (!satellite->event)
    return;
  satellite->last_event->next = host->event;
  host->event = satellite->event;
  if (!host->last_event)
    host->last_event = satellite->last_event;
}

static void join_cohort(ew_cohort *to, const ew_cohort *from) {
  double mass = to->mass + from->mass;
  to->time = (to->time * to->mass + from->time * from->mass) / mass;
  to->mass = mass;
  to->returned += from->returned;
  to->white_dwarfs += from->white_dwarfs;
  to->ia_expected += from->ia_expected;
  to->done = fmax(to->done, from->done);
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    to->formed.mass[i] += from->formed.mass[i];
}

static void join_cohorts(ew_galaxy *host, ew_galaxy *satellite) {
  if (!host->cohort) {
    host->cohort = satellite->cohort;
    host->cohort_count = satellite->cohort_count;
    return;
  }
  for (size_t i = 0; i < satellite->cohort_count; i++)
    if (satellite->cohort[i].mass > 0.0)
      join_cohort(&host->cohort[i], &satellite->cohort[i]);
}

/* What arrives does not count as a change to which the stars respond: it comes with the merger. */
static void join_contents(ew_galaxy *host, const ew_galaxy *satellite) {
  ew_ledger_add(&host->ledger, &satellite->ledger);
  host->response_gas += ew_gas_in_galaxy(satellite);
  host->response_stars += ew_stellar_mass(satellite);
  host->held += satellite->held;
  host->held_squares += satellite->held_squares;
  host->recovers_at = fmax(host->recovers_at, satellite->recovers_at);
}

static void count_merger(ew_galaxy *host, const ew_galaxy *satellite, const ew_merger *merger) {
  if (!(host->formed > 0.0) || merger->mass_ratio < COUNTED_RATIO)
    return;
  if (satellite && satellite->formed > 0.0)
    host->luminous_mergers++;
  else
    host->dark_mergers++;
  host->last_merger_redshift = merger->redshift;
}

static void add_history(ew_galaxy *host, const ew_galaxy *satellite, const ew_environment *environment) {
  if (!(host->formed > 0.0)) {
    host->response_gas = ew_gas_in_galaxy(host);
    host->response_scale = ew_disc_half_mass_radius(host, environment);
  }
  host->formed += satellite->formed;
  host->half_mass_at = NAN;
  host->formed_metal_free += satellite->formed_metal_free;
  host->last_formed_at = fmax(host->last_formed_at, satellite->last_formed_at);
}

ew_status ew_galaxy_merge(ew_galaxy *host, ew_galaxy *satellite, const ew_merger *merger,
                          const ew_environment *environment, ew_error *error) {
  ew_galaxy_settle(host, environment);
  if (satellite)
    ew_galaxy_settle(satellite, environment);
  count_merger(host, satellite, merger);
  grow(host, satellite, merger, environment);
  if (!satellite)
    return EW_OK;
  join_contents(host, satellite);
  add_history(host, satellite, environment);
  join_components(host, satellite);
  join_events(host, satellite);
  join_cohorts(host, satellite);
  host->idle = false;
  if (!ew_pending_join(host, satellite, environment->calendar))
    return ew_fail_memory(error, "a merger");
  return EW_OK;
}
