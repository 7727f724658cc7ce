/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The linear power spectrum today: construction, normalisation to sigma8 and values at a wavenumber. */
#include "cosmology/spectrum.h"

#include <math.h>
#include <stdlib.h>

/* Scales the spectrum, until then of amplitude 1, to the wanted rms in top hats of 8 Mpc/h. */
static ew_status normalise(ew_spectrum *spectrum, ew_error *error) {
  const ew_cosmology_parameters *p = ew_cosmology_get(spectrum->cosmology);
  double variance, derivative;
  ew_status status =
      ew_variance_integrate(spectrum, ew_filter_of(EW_FILTER_TOP_HAT), 8.0 / p->hubble, &variance, &derivative, error);
  if (status != EW_OK)
    return status;
  spectrum->amplitude = p->sigma8 * p->sigma8 / variance;
  for (int i = 0; i < 2 * (spectrum->sigma.cells + 1); i++)
    spectrum->sigma.knot[i] *= sqrt(spectrum->amplitude);
  return EW_OK;
}

ew_status ew_spectrum_new(ew_spectrum **spectrum, const ew_cosmology *cosmology,
                          const ew_spectrum_parameters *parameters, ew_error *error) {
  *spectrum = NULL;
  ew_status status = ew_rows_check(ew_spectrum_rows, parameters, error);
  if (status != EW_OK)
    return status;
  ew_spectrum *made = calloc(1, sizeof *made);
  if (!made)
    return ew_fail_memory(error, "the power spectrum");
  *made = (ew_spectrum){.cosmology = cosmology,
                        .parameters = *parameters,
                        .transfer = ew_transfer_of(parameters->transfer),
                        .filter = ew_filter_of(parameters->filter),
                        .amplitude = 1.0};
  status = ew_variance_tabulate(made, error);
  if (status == EW_OK)
    status = normalise(made, error);
  if (status == EW_OK)
    *spectrum = made;
  else
    ew_spectrum_free(made);
  return status;
}

void ew_spectrum_free(ew_spectrum *spectrum) {
  if (!spectrum)
    return;
  ew_curve_clear(&spectrum->sigma);
  free(spectrum);
}

const ew_cosmology *ew_spectrum_cosmology(const ew_spectrum *spectrum) {
  return spectrum->cosmology;
}

double ew_transfer_at(const ew_spectrum *spectrum, double wavenumber) {
  return spectrum->transfer->evaluate(ew_cosmology_get(spectrum->cosmology), wavenumber);
}

double ew_power_at(const ew_spectrum *spectrum, double wavenumber) {
  double transfer = ew_transfer_at(spectrum, wavenumber);
  double slope = ew_cosmology_get(spectrum->cosmology)->spectral_index;
  return spectrum->amplitude * pow(wavenumber, slope) * transfer * transfer;
}

double ew_power_per_log(const ew_spectrum *spectrum, double wavenumber) {
  double cube = wavenumber * wavenumber * wavenumber;
  return cube * ew_power_at(spectrum, wavenumber) / (2.0 * EW_PI * EW_PI);
}
