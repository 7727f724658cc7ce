/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Stars form in clusters out of molecular gas, whose share follows the pressure in an exponential disc (Blitz &
 * Rosolowsky 2006, ApJ 650, 933, eqs 3 and 11). The number of clusters in a step is Poisson with the mean that the law
 * asks for; each takes its metals from the gas with the scatter of incomplete mixing, and heats the rest of its cloud.
 */
#include "galaxy/state.h"

#include <math.h>

#define ROW(field) offsetof(ew_star_formation_parameters, field)

const ew_parameter ew_star_formation_rows[] = {
    {.name = "star_formation.depletion_time",
     .type = EW_REAL,
     .offset = ROW(depletion_time),
     .unit = "Gyr",
     .standard = "2",
     .low = 0.05,
     .high = 50,
     .meaning = "time in which molecular gas would turn into stars",
     .source = "Bigiel et al. 2008, AJ 136, 2846; Leroy et al. 2013, AJ 146, 19"},
    {.name = "star_formation.pressure_scale",
     .type = EW_REAL,
     .offset = ROW(pressure_scale),
     .unit = "K cm^-3",
     .standard = "4.3e4",
     .low = 1e3,
     .high = 1e6,
     .meaning = "P0/k at which half of the gas is molecular",
     .source = "Blitz & Rosolowsky 2006, ApJ 650, 933"},
    {.name = "star_formation.pressure_slope",
     .type = EW_REAL,
     .offset = ROW(pressure_slope),
     .unit = "1",
     .standard = "0.92",
     .low = 0.3,
     .high = 2,
     .meaning = "power of the pressure in the ratio of molecular to atomic gas",
     .source = "Blitz & Rosolowsky 2006, ApJ 650, 933"},
    {.name = "star_formation.dispersion_ratio",
     .type = EW_REAL,
     .offset = ROW(dispersion_ratio),
     .unit = "1",
     .standard = "1",
     .low = 0,
     .high = 3,
     .meaning = "velocity dispersion of gas over that of stars: weight of the stars in the pressure",
     .source = "own choice: both are about 8 km/s in dwarfs"},
    {.name = "star_formation.cluster_range",
     .type = EW_INTERVAL,
     .offset = ROW(cluster_range),
     .unit = "Msun",
     .standard = "[30.0, 1e4]",
     .low = 1,
     .high = 1e6,
     .meaning = "masses of star clusters at birth",
     .source = "Lada & Lada 2003, ARA&A 41, 57; limits own choice"},
    {.name = "star_formation.cluster_slope",
     .type = EW_REAL,
     .offset = ROW(cluster_slope),
     .unit = "1",
     .standard = "2",
     .low = 0,
     .high = 4,
     .meaning = "dN/dm ~ m^-slope of star clusters",
     .source = "Lada & Lada 2003, ARA&A 41, 57"},
    {.name = "star_formation.cluster_efficiency",
     .type = EW_REAL,
     .offset = ROW(cluster_efficiency),
     .unit = "1",
     .standard = "0.3",
     .low = 0.01,
     .high = 1,
     .meaning = "share of its cloud that a cluster turns into stars",
     .source = "Lada & Lada 2003, ARA&A 41, 57: 0.1 to 0.3"},
    {.name = "star_formation.heated_time",
     .type = EW_REAL,
     .offset = ROW(heated_time),
     .unit = "Gyr",
     .standard = "0.01",
     .low = 1e-4,
     .high = 0.5,
     .meaning = "e-folding time in which the rest of the cloud cools and can form stars again",
     .source = "own choice"},
    {.name = "star_formation.star_by_star_mass",
     .type = EW_REAL,
     .offset = ROW(star_by_star_mass),
     .unit = "Msun",
     .standard = "1e3",
     .low = 0,
     .high = 1e6,
     .meaning = "supernovae of lighter clusters are drawn one by one, of others by mass bins",
     .source = "own choice"},
    {.name = NULL},
};

const ew_process_record ew_star_formation_process = {
    .name = "star_formation",
    .meaning = "turns molecular gas into star clusters",
    .source = "Blitz & Rosolowsky 2006, ApJ 650, 933",
    .rows = ew_star_formation_rows,
};

#define PRESSURE_OF_COLUMN 33.12 /* (pi G/2) (1 Msun/pc^2)^2 / k [K cm^-3] */
#define KPC2_IN_PC2        1e6
#define HEAVIEST_STAR      100.0 /* Msun, of the normal IMF */
#define MANY_CLUSTERS      8.0   /* expected in a step: more are drawn by classes of mass */
enum { CLUSTER_CLASSES = 8 };

/* Radii, in scale lengths, that halve eight rings of equal mass of an exponential disc, and exp(-radius) there. */
enum { RINGS = 8 };
static const double ring_radius[RINGS] = {0.403527, 0.789671, 1.131537, 1.486065,
                                          1.886842, 2.381458, 3.080097, 4.472285};
static const double ring_column[RINGS] = {0.667960, 0.453994, 0.322537, 0.226261,
                                          0.151550, 0.092416, 0.045955, 0.011421};

/* Edges of the rings; the outermost ends where 99 per cent of the mass lie inside. */
static const double ring_edge[RINGS + 1] = {0.0,      0.609381, 0.961279, 1.305149, 1.678347,
                                            2.118031, 2.692635, 3.607024, 6.638352};

double ew_disc_half_mass_radius(const ew_galaxy *galaxy, const ew_environment *environment) {
  double scale = galaxy->luck.spin / sqrt(2.0) * environment->halo.radius * environment->model->sizes.birth_factor;
  return EW_EXPONENTIAL_HALF * scale;
}

/* Column density in the centre of an exponential disc of that mass and half-mass radius, Msun/pc^2. */
static double central_column(double mass, double half_mass_radius) {
  double scale = half_mass_radius / EW_EXPONENTIAL_HALF;
  return mass / (2.0 * EW_PI * scale * scale * KPC2_IN_PC2);
}

/* The disc's molecular gas: its share of all gas, and the radius that holds half of it, at which stars are born. */
typedef struct {
  double share;
  double half_mass_radius; /* kpc */
} molecular_gas;

/* Molecular share in each ring. Stars lie as an exponential of their own half-mass radius. */
static void fill_rings(const ew_step *step, double gas_mass, double disc, double share[RINGS]) {
  const ew_star_formation_parameters *p = &step->environment->model->star_formation;
  double stars = ew_half_mass_radius(step->galaxy);
  double gas_column = central_column(gas_mass, disc);
  double star_mass = ew_ledger_mass(&step->galaxy->ledger, EW_LIVING_STARS);
  double star_column = stars > 0.0 ? p->dispersion_ratio * central_column(star_mass, stars) : 0.0;
  double stretch = stars > 0.0 ? disc / stars : 0.0;
  for (int i = 0; i < RINGS; i++) {
    double gas = gas_column * ring_column[i];
    double pressure = PRESSURE_OF_COLUMN * gas * (gas + star_column * exp(-ring_radius[i] * stretch));
    double ratio = pow(pressure / p->pressure_scale, p->pressure_slope);
    share[i] = ratio / (1.0 + ratio);
  }
}

static molecular_gas find_molecular_gas(const ew_step *step, double gas_mass) {
  double disc = ew_disc_half_mass_radius(step->galaxy, step->environment), share[RINGS], sum = 0.0, inside = 0.0;
  fill_rings(step, gas_mass, disc, share);
  for (int i = 0; i < RINGS; i++)
    sum += share[i];
  int ring = 0;
  while (ring + 1 < RINGS && inside + share[ring] < 0.5 * sum)
    inside += share[ring++];
  double part = sum > 0.0 ? (0.5 * sum - inside) / share[ring] : 0.5;
  double radius = ring_edge[ring] + part * (ring_edge[ring + 1] - ring_edge[ring]);
  return (molecular_gas){sum / RINGS, radius * disc / EW_EXPONENTIAL_HALF};
}

/* Deaths of a cluster light enough to be drawn star by star. */
static void schedule_star_by_star(ew_step *step, double mass, const ew_composition *fraction, ew_stream *stream) {
  const ew_stars *stars = step->environment->world->stars;
  const ew_stars_parameters *p = ew_stars_get(stars);
  double metals = ew_composition_metals(fraction);
  uint64_t count = ew_draw_poisson(stream, mass * ew_supernovae_per_mass(stars));
  for (uint64_t i = 0; i < count; i++) {
    double star = ew_imf_draw(p->supernova_mass, p->collapse_mass, ew_draw_uniform(stream));
    bool hypernova = ew_draw_uniform(stream) < p->hypernova_fraction;
    ew_dying dying = {ew_death_of(stars, star, metals, hypernova), ew_lifetime(stars, star, metals), 1.0, false,
                      fraction};
    ew_schedule_death(step, &dying);
  }
}

/* Deaths of heavier clusters together, by bins of stellar mass. */
static void schedule_by_bins(ew_step *step, double mass, const ew_composition *fraction, ew_stream *stream) {
  const ew_stars *stars = step->environment->world->stars;
  double metals = ew_composition_metals(fraction);
  for (int bin = 0; bin < EW_SUPERNOVA_BINS; bin++) {
    double count = (double)ew_draw_poisson(stream, mass * ew_supernova_bin_number(stars, bin));
    double star = sqrt(ew_supernova_bin_edge(stars, bin) * ew_supernova_bin_edge(stars, bin + 1));
    ew_dying dying = {ew_supernova_bin_death(stars, bin, metals), ew_lifetime(stars, star, metals), count, false,
                      fraction};
    if (count > 0.0)
      ew_schedule_death(step, &dying);
  }
}

/* Stars too massive to explode, all of their mean mass: only their wind is given back. */
static void schedule_collapses(ew_step *step, double mass, const ew_composition *fraction) {
  const ew_stars *stars = step->environment->world->stars;
  double lowest = ew_stars_get(stars)->collapse_mass, metals = ew_composition_metals(fraction);
  double number = ew_imf_number(lowest, HEAVIEST_STAR);
  if (!(number > 0.0))
    return;
  double star = ew_imf_mass(lowest, HEAVIEST_STAR) / number;
  ew_dying dying = {ew_death_of(stars, star, metals, false), ew_lifetime(stars, star, metals), mass * number, false,
                    fraction};
  ew_schedule_death(step, &dying);
}

/* Everything that happens in one step of star formation. */
typedef struct {
  ew_step *step;
  ew_star_event *event;
  ew_stream masses, mixing, deaths;
  double radius;                                   /* kpc, at which stars are born */
  double formed, pooled;                           /* Msun: all, and of that what dies by bins */
  ew_composition formed_elements, pooled_elements; /* Msun */
} birth;

static void add_scaled(ew_composition *sum, const ew_composition *fraction, double mass) {
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    sum->mass[i] += mass * fraction->mass[i];
}

static void take_from_gas(birth *b, double mass, const ew_composition *fraction) {
  double efficiency = b->step->environment->model->star_formation.cluster_efficiency;
  ew_ledger *ledger = &b->step->galaxy->ledger;
  ew_composition formed = {{0}};
  add_scaled(&formed, fraction, mass);
  ew_ledger_move(ledger, EW_DISC_GAS, EW_LIVING_STARS, &formed);
  ew_ledger_move_mass(ledger, EW_DISC_GAS, EW_HEATED_GAS, mass * (1.0 / efficiency - 1.0));
}

static void write_down(birth *b, double mass, const ew_composition *fraction) {
  ew_event_add(b->event, mass, fraction);
  ew_component_add(b->step, mass, b->radius);
  b->formed += mass;
  add_scaled(&b->formed_elements, fraction, mass);
}

/* Hydrogen and helium of the disc: what a cluster needs, whatever metals it draws. */
static double light_gas(const birth *b) {
  const ew_composition *gas = &b->step->galaxy->ledger.in[EW_DISC_GAS];
  return gas->mass[EW_HYDROGEN] + gas->mass[EW_HELIUM];
}

/* `alike` clusters of that mass and one composition; false if there is no gas or memory for them. */
static bool form_clusters_alike(birth *b, double mass, double alike) {
  const ew_star_formation_parameters *p = &b->step->environment->model->star_formation;
  double total = mass * alike;
  if (total > p->cluster_efficiency * light_gas(b))
    return false;
  b->event = b->event ? b->event : ew_event_of_slot(b->step, false);
  if (!b->event)
    return false;
  ew_composition fraction;
  ew_mix_cluster(b->step, &b->mixing, total, &fraction);
  take_from_gas(b, total, &fraction);
  write_down(b, total, &fraction);
  if (alike == 1.0 && mass < p->star_by_star_mass) {
    schedule_star_by_star(b->step, mass, &fraction, &b->deaths);
  } else {
    b->pooled += total;
    add_scaled(&b->pooled_elements, &fraction, total);
  }
  return true;
}

static ew_composition mean_fraction(const ew_composition *sum, double mass) {
  ew_composition fraction;
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    fraction.mass[i] = sum->mass[i] / mass;
  return fraction;
}

static void finish_birth(birth *b) {
  if (b->pooled > 0.0) {
    ew_composition pooled = mean_fraction(&b->pooled_elements, b->pooled);
    schedule_by_bins(b->step, b->pooled, &pooled, &b->deaths);
  }
  if (b->formed > 0.0) {
    ew_composition formed = mean_fraction(&b->formed_elements, b->formed);
    schedule_collapses(b->step, b->formed, &formed);
    ew_cohort_add(b->step, b->formed, &formed);
  }
}

static void form_one_by_one(birth *b, double number, const ew_power_law *law) {
  uint64_t count = ew_draw_poisson(&b->masses, number);
  for (uint64_t i = 0; i < count && !b->step->short_of_memory; i++)
    if (!form_clusters_alike(b, ew_power_law_draw(law, ew_draw_uniform(&b->masses)), 1.0))
      return;
}

/* Classes even in log mass: how many clusters each has is Poisson, so the sum scatters as that of single clusters
 * does. All of a class have its mean mass. */
static void form_by_classes(birth *b, double number, const ew_power_law *law) {
  double width = pow(law->high / law->low, 1.0 / CLUSTER_CLASSES);
  for (int i = 0; i < CLUSTER_CLASSES && !b->step->short_of_memory; i++) {
    double low = law->low * pow(width, i);
    ew_power_law members = {law->slope, low, low * width};
    double count = (double)ew_draw_poisson(&b->masses, number * ew_power_law_share(law, low, low * width));
    if (count > 0.0 && !form_clusters_alike(b, ew_power_law_mean(&members), count))
      return;
  }
}

static void form_clusters(ew_step *step, const molecular_gas *gas, const ew_power_law *law) {
  double time_scale = step->environment->model->star_formation.depletion_time;
  double expected = ew_ledger_mass(&step->galaxy->ledger, EW_DISC_GAS) * gas->share * ew_step_decay(step, time_scale);
  birth b = {.step = step,
             .radius = gas->half_mass_radius,
             .masses = ew_step_stream(step, EW_PROCESS_BURSTS, EW_DRAW_CLUSTERS),
             .mixing = ew_step_stream(step, EW_PROCESS_MIXING, EW_DRAW_MIXING),
             .deaths = ew_step_stream(step, EW_PROCESS_BURSTS, EW_DRAW_SUPERNOVAE)};
  double number = expected / ew_power_law_mean(law);
  if (number > MANY_CLUSTERS)
    form_by_classes(&b, number, law);
  else
    form_one_by_one(&b, number, law);
  finish_birth(&b);
}

void ew_form_stars(ew_step *step) {
  ew_galaxy *galaxy = step->galaxy;
  const ew_model *model = step->environment->model;
  const ew_star_formation_parameters *p = &model->star_formation;
  double gas = ew_ledger_mass(&galaxy->ledger, EW_DISC_GAS);
  ew_power_law law = {p->cluster_slope, p->cluster_range[0], fmin(p->cluster_range[1], p->cluster_efficiency * gas)};
  if (step->start < galaxy->recovers_at || !(law.high > law.low))
    return;
  double metals = ew_composition_metals(&galaxy->ledger.in[EW_DISC_GAS]) / gas;
  if (model->first_stars.threshold != EW_FIRST_STARS_NONE &&
      metals < EW_SOLAR_METALS * pow(10.0, model->first_stars.critical_metallicity)) {
    ew_form_first_stars(step);
    return;
  }
  molecular_gas molecular = find_molecular_gas(step, gas);
  form_clusters(step, &molecular, &law);
}
