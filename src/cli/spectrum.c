/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The cosmology of a parameter file as a spectrum file and two short tables. */
#include "cli/cli.h"

#include <math.h>

static void print_masses(const ew_spectrum *spectrum) {
  enum { LOWEST_LOG_MASS = 4, HIGHEST_LOG_MASS = 15 };
  puts("      mass       sigma      slope   press_schechter   sheth_tormen");
  puts("    [Msun]                                  [Mpc^-3]       [Mpc^-3]");
  for (int decade = LOWEST_LOG_MASS; decade <= HIGHEST_LOG_MASS; decade++) {
    double mass = pow(10.0, decade);
    printf("%10.0e  %10.5f  %9.5f  %16.5e  %13.5e\n", mass, ew_sigma(spectrum, mass), ew_sigma_slope(spectrum, mass),
           ew_mass_function_at(&ew_press_schechter, spectrum, mass, 0.0),
           ew_mass_function_at(&ew_sheth_tormen, spectrum, mass, 0.0));
  }
}

static void print_redshifts(const ew_cosmology *cosmology) {
  static const double redshifts[] = {0, 0.5, 1, 2, 4, 6, 10, 20, 40};
  puts("\n  redshift       age     growth   hubble_rate");
  puts("               [Gyr]               [km/s/Mpc]");
  for (size_t i = 0; i < sizeof redshifts / sizeof redshifts[0]; i++)
    printf("%10.1f  %8.5f  %9.6f  %12.3f\n", redshifts[i], ew_age(cosmology, redshifts[i]),
           ew_growth(cosmology, redshifts[i]), ew_hubble_rate(cosmology, redshifts[i]));
}

static ew_status write_and_tell(const ew_request *request, const ew_cosmology *cosmology, bool quiet, ew_error *error) {
  ew_spectrum *spectrum;
  ew_status status = ew_spectrum_new(&spectrum, cosmology, &request->settings.spectrum, error);
  if (status != EW_OK)
    return status;
  status = ew_spectrum_write(spectrum, request->output, request->parameter_text, error);
  if (status == EW_OK && !quiet) {
    print_masses(spectrum);
    print_redshifts(cosmology);
    printf("\nwrote %s\n", request->output);
  }
  ew_spectrum_free(spectrum);
  return status;
}

static ew_status act(const ew_options *options, ew_error *error) {
  ew_request request;
  ew_status status = ew_request_open(&request, options, ".spectrum.h5", error);
  ew_cosmology *cosmology = NULL;
  if (status == EW_OK)
    status = ew_cosmology_new(&cosmology, &request.settings.cosmology, error);
  if (status == EW_OK)
    status = write_and_tell(&request, cosmology, options->quiet, error);
  ew_cosmology_free(cosmology);
  ew_request_close(&request);
  return status;
}

const ew_command ew_command_spectrum = {
    .name = "spectrum",
    .meaning = "writes power spectrum, sigma(M) and mass functions of a parameter file's cosmology",
    .help = "Writes background, linear power spectrum, sigma(M) and mass functions of the cosmology in PARAMS\n"
            "(HDF5: /background, /power, /variance, /mass_function) and prints them in brief, at redshift 0\n"
            "where not said otherwise. Without -o the file of NAME.cfg is NAME.spectrum.h5 in the current folder.",
    .options = EW_OPTIONS_OF_A_JOB,
    .takes_file = true,
    .act = act,
};
