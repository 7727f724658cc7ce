/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * First stars: gas below the critical metallicity forms a burst of stars drawn one by one from a top-heavy IMF. Their
 * light heats all gas of the galaxy until the last massive one has died; their supernovae decide whether the halo keeps
 * it.
 */
#include "galaxy/state.h"

#include <math.h>

#define ROW(field) offsetof(ew_first_star_parameters, field)

static const ew_choice thresholds[] = {
    {"none", "gas cools in atomic-cooling haloes and forms normal stars, whatever its metals", "limit"},
    {"atomic", "haloes of virial temperature 1e4 K", "common practice"},
    {"molecular", "molecular cooling against a Lyman-Werner background and streaming",
     "Kulkarni, Visbal & Bryan 2021, ApJ 917, 40"},
    {NULL, NULL, NULL},
};

const ew_parameter ew_first_star_rows[] = {
    {.name = "first_stars.threshold",
     .type = EW_CHOICE,
     .offset = ROW(threshold),
     .unit = "",
     .standard = "\"molecular\"",
     .choices = thresholds,
     .meaning = "halo mass above which gas cools for the first time",
     .source = "Kulkarni, Visbal & Bryan 2021, ApJ 917, 40, coefficients from memory"},
    {.name = "first_stars.streaming_rms",
     .type = EW_REAL,
     .offset = ROW(streaming_rms),
     .unit = "km/s",
     .standard = "30",
     .low = 0,
     .high = 60,
     .meaning = "rms of the streaming velocity of baryons at z = 1060; each root draws its own",
     .source = "Tseliakhovich & Hirata 2010, PRD 82, 083520"},
    {.name = "first_stars.background",
     .type = EW_REAL,
     .offset = ROW(background),
     .unit = "1",
     .standard = "1",
     .low = 0,
     .high = 100,
     .meaning = "factor on the Lyman-Werner background",
     .source = "Incatasciato, Khochfar & Onorbe 2023, MNRAS 522, 330, from memory"},
    {.name = "first_stars.critical_metallicity",
     .type = EW_REAL,
     .offset = ROW(critical_metallicity),
     .unit = "dex",
     .standard = "-4.5",
     .low = -6,
     .high = -3.5,
     .meaning = "log10 of the metal mass fraction over solar below which first stars form",
     .source = "between dust (1e-6) and fine-structure cooling (10^-3.5), from memory; own choice in the middle"},
    {.name = "first_stars.imf_slope",
     .type = EW_REAL,
     .offset = ROW(imf_slope),
     .unit = "1",
     .standard = "1",
     .low = -1,
     .high = 3,
     .meaning = "dN/dm ~ m^-slope of first stars; 1 is even in log mass",
     .source = "Hartwig et al. 2018, MNRAS 478, 1795, from memory"},
    {.name = "first_stars.imf_range",
     .type = EW_INTERVAL,
     .offset = ROW(imf_range),
     .unit = "Msun",
     .standard = "[2.0, 180.0]",
     .low = 0.5,
     .high = 500,
     .meaning = "masses of first stars",
     .source = "Hartwig et al. 2018, MNRAS 478, 1795, from memory"},
    {.name = "first_stars.burst_mass",
     .type = EW_REAL,
     .offset = ROW(burst_mass),
     .unit = "Msun",
     .standard = "200",
     .low = 1,
     .high = 1e5,
     .meaning = "stars are drawn until their masses reach this",
     .source = "own choice: simulated minihaloes form some 100 to 1000 Msun"},
    {.name = "first_stars.collapse_mass",
     .type = EW_REAL,
     .offset = ROW(collapse_mass),
     .unit = "Msun",
     .standard = "40",
     .low = 15,
     .high = 140,
     .meaning = "first stars above, and below pair instability, collapse and eject nothing",
     .source = "Heger & Woosley 2002, ApJ 567, 532: 25 to 40"},
    {.name = "first_stars.binding_factor",
     .type = EW_REAL,
     .offset = ROW(binding_factor),
     .unit = "1",
     .standard = "2",
     .low = 0.1,
     .high = 100,
     .meaning = "a halo loses its gas if explosions give this times its binding energy",
     .source = "own choice"},
    {.name = "first_stars.recovery_range",
     .type = EW_INTERVAL,
     .offset = ROW(recovery_range),
     .unit = "Gyr",
     .standard = "[0.01, 0.1]",
     .low = 0,
     .high = 1,
     .meaning = "time until gas that stayed forms stars again, growing with energy over binding energy",
     .source = "after Jeon et al. 2014, MNRAS 444, 3288"},
    {.name = NULL},
};

const ew_process_record ew_first_star_process = {
    .name = "first_stars",
    .meaning = "metal-free stars, where they form, how they die",
    .source = "Kulkarni, Visbal & Bryan 2021, ApJ 917, 40",
    .rows = ew_first_star_rows,
};

enum { MOST_STARS = 4096 }; /* in one burst */

/* Stars that outlive the span of pending deaths but not the age of the universe die at the end of that span: what they
 * give back is early, by less than 1 Gyr above 2 Msun, by more for lighter ones. Those that live on stay. */
static void schedule(ew_step *step, double star, bool hypernova, const ew_composition *fraction) {
  const ew_stars *stars = step->environment->world->stars;
  double life = ew_lifetime_metal_free(stars, star);
  if (step->end + life > step->environment->calendar->end && life > EW_PENDING_SPAN)
    return;
  double collapse = step->environment->model->first_stars.collapse_mass;
  ew_dying dying = {ew_death_of_metal_free(stars, star, collapse, hypernova), life, 1.0, true, fraction};
  ew_schedule_death(step, &dying);
}

static double draw_star(const ew_step *step, ew_stream *stream) {
  const ew_first_star_parameters *p = &step->environment->model->first_stars;
  ew_power_law law = {p->imf_slope, p->imf_range[0], p->imf_range[1]};
  return ew_power_law_draw(&law, ew_draw_uniform(stream));
}

static void form_star(ew_step *step, double star, ew_star_event *event, bool hypernova) {
  ew_ledger *ledger = &step->galaxy->ledger;
  double gas = ew_ledger_mass(ledger, EW_DISC_GAS);
  ew_composition fraction = ledger->in[EW_DISC_GAS];
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    fraction.mass[i] /= gas;
  ew_ledger_move_mass(ledger, EW_DISC_GAS, EW_LIVING_STARS, star);
  ew_event_add(event, star, &fraction);
  ew_component_add(step, star, ew_disc_half_mass_radius(step->galaxy, step->environment));
  schedule(step, star, hypernova, &fraction);
}

/* How long a star heats gas: for all its life if it is one of those that explode or collapse; others are too cool. */
static double heating_time(const ew_step *step, double star) {
  const ew_stars *stars = step->environment->world->stars;
  return star >= ew_stars_get(stars)->supernova_mass ? ew_lifetime_metal_free(stars, star) : 0.0;
}

/* All gas of the galaxy is heated until the longest-lived massive star has died. */
static void heat_gas(ew_step *step, double longest_life) {
  ew_ledger_move_share(&step->galaxy->ledger, EW_DISC_GAS, EW_HEATED_GAS, 1.0);
  step->galaxy->recovers_at = fmax(step->galaxy->recovers_at, step->end + longest_life);
}

void ew_form_first_stars(ew_step *step) {
  const ew_environment *e = step->environment;
  ew_galaxy *galaxy = step->galaxy;
  double hypernova_fraction = ew_stars_get(e->world->stars)->hypernova_fraction;
  double left = e->model->first_stars.burst_mass, longest_life = 0.0;
  ew_stream stream = ew_stream_open(e->draws, EW_PROCESS_FIRST_STARS, galaxy->branch, galaxy->first_star_events);
  ew_star_event *event = NULL;
  for (int i = 0; i < MOST_STARS && left > 0.0; i++) {
    double star = draw_star(step, &stream);
    bool hypernova = ew_draw_uniform(&stream) < hypernova_fraction;
    if (star > e->model->star_formation.cluster_efficiency * ew_ledger_mass(&galaxy->ledger, EW_DISC_GAS))
      break;
    event = event ? event : ew_event_of_slot(step, true);
    if (!event)
      return;
    form_star(step, star, event, hypernova);
    left -= star;
    longest_life = fmax(longest_life, heating_time(step, star));
  }
  if (!event)
    return;
  galaxy->first_star_events++;
  heat_gas(step, longest_life);
}
