/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Would this run? Validates a parameter file and everything it names, and runs nothing. */
#include "cli/cli.h"

static void print_facts(const char *file, const ew_settings *settings) {
  const ew_root_parameters *roots = &settings->roots;
  printf("%s is fine: %lld trees of ", file, (long long)roots->count);
  if (roots->kind == EW_ROOTS_SINGLE)
    printf("%g Msun", roots->mass);
  else
    printf("%g to %g Msun", roots->mass_range[0], roots->mass_range[1]);
  printf(" at redshift %g, resolution %g Msun, %lld realizations each\n", roots->redshift,
         settings->trees.resolution_mass, (long long)settings->ensemble.realizations);
}

static ew_status act(const ew_options *options, ew_error *error) {
  ew_request request;
  ew_status status = ew_request_open(&request, options, NULL, error);
  ew_laboratory *laboratory = NULL;
  if (status == EW_OK)
    status = ew_laboratory_new(&laboratory, &request.settings, error);
  if (status == EW_OK && !options->quiet)
    print_facts(options->file, &request.settings);
  ew_laboratory_free(laboratory);
  ew_request_close(&request);
  return status;
}

const ew_command ew_command_check = {
    .name = "check",
    .meaning = "validates a parameter file and every input that it names, runs nothing",
    .help = "Validates PARAMS and every input that it names, with the same options as `run`, and the output if\n"
            "-o names one. Runs nothing and writes nothing.",
    .options = EW_OPTIONS_OF_A_JOB,
    .takes_file = true,
    .act = act,
};
