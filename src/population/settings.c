/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The registry: every parameter row of the library and every process that acts on galaxies. Adding a process takes one
 * line in `processes`; its rows then appear everywhere. */
#include "elfinwood/population.h"

#define ROOT(field)     offsetof(ew_root_parameters, field)
#define ENSEMBLE(field) offsetof(ew_ensemble_parameters, field)

static const ew_choice root_kinds[] = {
    {"single", "roots.count haloes of roots.mass", "own choice"},
    {"range", "roots.count haloes, log-uniform in roots.mass_range", "own choice"},
    {NULL, NULL, NULL},
};

static const ew_parameter root_rows[] = {
    {.name = "roots.kind",
     .type = EW_CHOICE,
     .offset = ROOT(kind),
     .unit = "",
     .standard = "\"range\"",
     .choices = root_kinds,
     .meaning = "how the haloes that trees grow from are chosen",
     .source = "own choice"},
    {.name = "roots.mass",
     .type = EW_REAL,
     .offset = ROOT(mass),
     .unit = "Msun",
     .standard = "1e10",
     .low = 1e5,
     .high = 1e15,
     .meaning = "virial mass of every root of kind \"single\"",
     .source = "own choice"},
    {.name = "roots.mass_range",
     .type = EW_INTERVAL,
     .offset = ROOT(mass_range),
     .unit = "Msun",
     .standard = "[1e8, 1e11]",
     .low = 1e5,
     .high = 1e15,
     .meaning = "lowest and highest mass of roots of kind \"range\"",
     .source = "own choice"},
    {.name = "roots.count",
     .type = EW_INTEGER,
     .offset = ROOT(count),
     .unit = "1",
     .standard = "100",
     .low = 1,
     .high = 1e9,
     .meaning = "number of trees",
     .source = "own choice"},
    {.name = "roots.redshift",
     .type = EW_REAL,
     .offset = ROOT(redshift),
     .unit = "1",
     .standard = "0",
     .low = 0,
     .high = 30,
     .meaning = "redshift of the roots, at which the run ends",
     .source = "own choice"},
    {.name = NULL},
};

static const ew_parameter random_rows[] = {
    {.name = "random.seed",
     .type = EW_INTEGER,
     .offset = offsetof(ew_random_parameters, seed),
     .unit = "1",
     .standard = "1",
     .low = 0,
     .high = 9.2e18,
     .meaning = "same seed and parameters, same datasets",
     .source = "own choice"},
    {.name = NULL},
};

static const ew_parameter ensemble_rows[] = {
    {.name = "ensemble.realizations",
     .type = EW_INTEGER,
     .offset = ENSEMBLE(realizations),
     .unit = "1",
     .standard = "1",
     .low = 1,
     .high = 1e6,
     .meaning = "galaxies evolved on each tree, with everything but the tree drawn anew",
     .source = "own choice"},
    {.name = "ensemble.time_step",
     .type = EW_REAL,
     .offset = ENSEMBLE(time_step),
     .unit = "Gyr",
     .standard = "0.01",
     .low = 0.002,
     .high = 0.02,
     .meaning = "width of a slot of the cosmic-time grid",
     .source = "own choice: short against the life of a star of 8 Msun"},
    {.name = NULL},
};

static const ew_parameter output_rows[] = {
    {.name = "output.members",
     .type = EW_FLAG,
     .offset = offsetof(ew_output_parameters, members),
     .unit = "",
     .standard = "false",
     .meaning = "galaxies that have fallen in and not yet merged are rows as well",
     .source = "own choice"},
    {.name = NULL},
};

/* One line for each process: the prefix of its record and rows, and its place in the model. */
#define PROCESSES(X)                                                                                                   \
  X(structure, structure)                                                                                              \
  X(reionization, reionization)                                                                                        \
  X(first_star, first_stars)                                                                                           \
  X(gas, gas)                                                                                                          \
  X(star_formation, star_formation)                                                                                    \
  X(feedback, feedback)                                                                                                \
  X(mixing, mixing)                                                                                                    \
  X(size, sizes)                                                                                                       \
  X(satellite, satellites)

#define PROCESS_GROUP(prefix, field)  {ew_##prefix##_rows, offsetof(ew_settings, model.field)},
#define PROCESS_RECORD(prefix, field) &ew_##prefix##_process,

static const ew_parameter_group groups[] = {
    {ew_cosmology_rows, offsetof(ew_settings, cosmology)},
    {ew_spectrum_rows, offsetof(ew_settings, spectrum)},
    {root_rows, offsetof(ew_settings, roots)},
    {ew_tree_rows, offsetof(ew_settings, trees)},
    {ew_stars_rows, offsetof(ew_settings, stars)},
    PROCESSES(PROCESS_GROUP){random_rows, offsetof(ew_settings, random)},
    {ensemble_rows, offsetof(ew_settings, ensemble)},
    {output_rows, offsetof(ew_settings, output)},
};

static const ew_process_record *const processes[] = {PROCESSES(PROCESS_RECORD)};

const ew_parameter_table *ew_settings_table(void) {
  static const ew_parameter_table table = {groups, sizeof groups / sizeof groups[0]};
  return &table;
}

const ew_process_record *const *ew_processes(size_t *count) {
  *count = sizeof processes / sizeof processes[0];
  return processes;
}

static ew_status check_roots(const ew_parameter_values *values, const ew_settings *settings, ew_error *error) {
  bool range = settings->roots.kind == EW_ROOTS_RANGE;
  double smallest = range ? settings->roots.mass_range[0] : settings->roots.mass;
  const char *name = range ? "roots.mass_range" : "roots.mass";
  if (!(smallest > settings->trees.resolution_mass))
    return ew_parameters_refuse(values, name, error, "roots must lie above trees.resolution_mass = %g Msun",
                                settings->trees.resolution_mass);
  if (!(settings->roots.redshift < settings->trees.highest_redshift))
    return ew_parameters_refuse(values, "roots.redshift", error, "must be below trees.highest_redshift = %g",
                                settings->trees.highest_redshift);
  return EW_OK;
}

static ew_status check_densities(const ew_parameter_values *values, const ew_settings *settings, ew_error *error) {
  const ew_cosmology_parameters *c = &settings->cosmology;
  if (!(c->omega_baryon <= c->omega_matter))
    return ew_parameters_refuse(values, "cosmology.omega_baryon", error, "exceeds cosmology.omega_matter = %g",
                                c->omega_matter);
  ew_error reason = {0};
  ew_cosmology *cosmology = NULL;
  ew_status status = ew_cosmology_new(&cosmology, c, &reason);
  ew_cosmology_free(cosmology);
  if (status == EW_REFUSED)
    return ew_parameters_refuse(values, "cosmology.omega_matter", error, "%s", reason.message);
  return status == EW_OK ? EW_OK : ew_fail(error, status, "%s", reason.message);
}

ew_status ew_settings_check(const ew_parameter_values *values, ew_error *error) {
  const ew_settings *settings = values->target;
  ew_status status = check_densities(values, settings, error);
  if (status == EW_OK)
    status = check_roots(values, settings, error);
  if (status != EW_OK)
    return status;
  ew_error reason = {0};
  const char *name = NULL;
  if (ew_model_check(&settings->model, &name, &reason) != EW_OK)
    return ew_parameters_refuse(values, name, error, "%s", reason.message);
  return EW_OK;
}
