/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * From the state to what is observed. Abundances are means over surviving stars, by number, of clusters that hold iron.
 */
#include "galaxy/state.h"

#include <math.h>

#define QUENCHED_FOR 0.5 /* Gyr without a new star */
#define KPC_IN_PC    1000.0

typedef struct {
  double weight, iron, iron_square;
  double ratio[EW_ELEMENT_COUNT];
  double light;
} tally;

static void tally_event(tally *sum, const ew_star_event *event, const ew_environment *environment) {
  const ew_stars *stars = environment->world->stars;
  double age = fmax(environment->calendar->end - event->time, 0.0);
  if (event->metal_free)
    return;
  double light = event->mass * ew_luminosity_v(stars, age, event->metal_fraction);
  sum->light += light;
  ew_component_root(event->component)->light += light;
  double number = event->iron_mass * ew_living_number(stars, age, event->metal_fraction);
  sum->weight += number;
  sum->iron += number * event->iron;
  sum->iron_square += number * event->iron_square;
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    sum->ratio[i] += number * event->ratio[i];
}

static tally tally_events(const ew_galaxy *galaxy, const ew_environment *environment) {
  tally sum = {0};
  for (ew_component *c = galaxy->component; c; c = c->next)
    c->light = 0.0;
  for (const ew_star_event *event = galaxy->event; event; event = event->next)
    tally_event(&sum, event, environment);
  return sum;
}

static void observe_abundances(const tally *sum, ew_observables *o) {
  bool known = sum->weight > 0.0;
  o->metallicity = known ? sum->iron / sum->weight : NAN;
  double square = known ? sum->iron_square / sum->weight : NAN;
  o->metallicity_spread = sqrt(fmax(square - o->metallicity * o->metallicity, 0.0));
  if (!known)
    o->metallicity_spread = NAN;
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    o->abundance[i] = known && i > EW_HELIUM ? sum->ratio[i] / sum->weight : NAN;
}

/* Time by which that share of the stars had formed: the events are few, so each bisection step adds them up. */
static double formation_time(const ew_galaxy *galaxy, const ew_environment *environment, double share) {
  double low = 0.0, high = environment->calendar->end, step = environment->calendar->step;
  while (high - low > 0.1 * step) {
    double middle = 0.5 * (low + high), before = 0.0;
    for (const ew_star_event *event = galaxy->event; event; event = event->next)
      before += event->mass * fmin(fmax((middle - event->time) / step + 0.5, 0.0), 1.0);
    if (before < share * galaxy->formed)
      low = middle;
    else
      high = middle;
  }
  return 0.5 * (low + high);
}

static int64_t quenched(const ew_galaxy *galaxy, const ew_environment *environment) {
  if (!(galaxy->formed > 0.0))
    return -1;
  return galaxy->last_formed_at < environment->calendar->end - QUENCHED_FOR;
}

static void observe_stars(ew_galaxy *galaxy, const ew_environment *environment, ew_observables *o) {
  tally sum = tally_events(galaxy, environment);
  bool shines = sum.light > 0.0;
  double stars = ew_ledger_mass(&galaxy->ledger, EW_LIVING_STARS) + ew_ledger_mass(&galaxy->ledger, EW_REMNANTS);
  o->stellar_mass = shines ? stars : 0.0;
  o->luminosity_v = sum.light;
  o->magnitude_v = shines ? EW_SUN_MAGNITUDE_V - 2.5 * log10(sum.light) : NAN;
  observe_abundances(&sum, o);
  o->half_light_radius = shines ? KPC_IN_PC * ew_projected_half_light_radius(galaxy) : NAN;
  o->velocity_dispersion = shines ? ew_velocity_dispersion(galaxy, environment) : NAN;
  bool formed = galaxy->formed > 0.0;
  o->time_50 = formed ? formation_time(galaxy, environment, 0.5) : NAN;
  o->time_90 = formed ? formation_time(galaxy, environment, 0.9) : NAN;
  o->first_star_fraction = formed ? galaxy->formed_metal_free / galaxy->formed : NAN;
}

void ew_galaxy_observe(ew_galaxy *galaxy, const ew_environment *environment, ew_observables *o) {
  ew_galaxy_settle(galaxy, environment);
  o->stellar_mass_formed = galaxy->formed;
  o->gas_mass = ew_gas_in_galaxy(galaxy);
  observe_stars(galaxy, environment, o);
  o->last_merger_redshift = galaxy->last_merger_redshift;
  o->luminous_mergers = galaxy->luminous_mergers;
  o->dark_mergers = galaxy->dark_mergers;
  o->quenched = quenched(galaxy, environment);
}

void ew_observe_nothing(ew_observables *o) {
  *o = (ew_observables){.magnitude_v = NAN,
                        .metallicity = NAN,
                        .metallicity_spread = NAN,
                        .half_light_radius = NAN,
                        .velocity_dispersion = NAN,
                        .time_50 = NAN,
                        .time_90 = NAN,
                        .first_star_fraction = NAN,
                        .last_merger_redshift = NAN,
                        .quenched = -1};
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    o->abundance[i] = NAN;
}
