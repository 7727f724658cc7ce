/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Parameter rows of the cosmology room. The defaults are the Planck 2018 values of the reference tables in
 * tests/data. */
#include "cosmology/rows.h"

#include "cosmology/choices.h"
#include "elfinwood/cosmology.h"

#include <string.h>

#define PLANCK     "Planck Collaboration VI 2020, A&A 641, A6, Table 2 (TT,TE,EE+lowE+lensing)"

#define ROW(field) offsetof(ew_cosmology_parameters, field)

const ew_parameter ew_cosmology_rows[] = {
    {.name = "cosmology.hubble",
     .type = EW_REAL,
     .offset = ROW(hubble),
     .unit = "100 km/s/Mpc",
     .standard = "0.6736",
     .low = 0.4,
     .high = 1.2,
     .meaning = "h, the expansion rate today",
     .source = PLANCK},
    {.name = "cosmology.omega_matter",
     .type = EW_REAL,
     .offset = ROW(omega_matter),
     .unit = "1",
     .standard = "0.3153",
     .low = 0.05,
     .high = 1,
     .meaning = "density of all matter today over the critical one; Lambda makes space flat",
     .source = PLANCK},
    {.name = "cosmology.omega_baryon",
     .type = EW_REAL,
     .offset = ROW(omega_baryon),
     .unit = "1",
     .standard = "0.0493",
     .low = 0,
     .high = 0.5,
     .meaning = "density of baryons today over the critical one; part of omega_matter",
     .source = PLANCK},
    {.name = "cosmology.spectral_index",
     .type = EW_REAL,
     .offset = ROW(spectral_index),
     .unit = "1",
     .standard = "0.9649",
     .low = 0.5,
     .high = 1.5,
     .meaning = "n_s, the slope of the primordial power spectrum",
     .source = PLANCK},
    {.name = "cosmology.sigma8",
     .type = EW_REAL,
     .offset = ROW(sigma8),
     .unit = "1",
     .standard = "0.8111",
     .low = 0.1,
     .high = 3,
     .meaning = "rms linear overdensity today in spheres of 8 Mpc/h",
     .source = PLANCK},
    {.name = "cosmology.cmb_temperature",
     .type = EW_REAL,
     .offset = ROW(cmb_temperature),
     .unit = "K",
     .standard = "2.7255",
     .low = 2,
     .high = 4,
     .meaning = "temperature of the microwave background today; enters the transfer function and the radiation density",
     .source = "Fixsen 2009, ApJ 707, 916"},
    {.name = "cosmology.neutrino_number",
     .type = EW_REAL,
     .offset = ROW(neutrino_number),
     .unit = "1",
     .standard = "3.046",
     .low = 0,
     .high = 10,
     .meaning = "effective number of massless neutrinos; counts only with radiation",
     .source = "Mangano et al. 2005, Nucl. Phys. B 729, 221"},
    {.name = "cosmology.radiation",
     .type = EW_FLAG,
     .offset = ROW(radiation),
     .unit = "",
     .standard = "false",
     .meaning = "count photons and massless neutrinos in the expansion and in the growth of structure",
     .source = "common practice"},
    {.name = "cosmology.collapse_threshold",
     .type = EW_CHOICE,
     .offset = ROW(collapse_threshold),
     .unit = "",
     .standard = "\"constant\"",
     .choices = ew_threshold_choices,
     .meaning = "linear overdensity at which a sphere collapses",
     .source = "common practice"},
};
const size_t ew_cosmology_row_count = sizeof ew_cosmology_rows / sizeof *ew_cosmology_rows;

#undef ROW
#define ROW(field) offsetof(ew_spectrum_parameters, field)

const ew_parameter ew_spectrum_rows[] = {
    {.name = "spectrum.transfer",
     .type = EW_CHOICE,
     .offset = ROW(transfer),
     .unit = "",
     .standard = "\"eisenstein_hu\"",
     .choices = ew_transfer_choices,
     .meaning = "transfer function that shapes the linear power spectrum",
     .source = "common practice"},
    {.name = "spectrum.filter",
     .type = EW_CHOICE,
     .offset = ROW(filter),
     .unit = "",
     .standard = "\"top_hat\"",
     .choices = ew_filter_choices,
     .meaning = "window that smooths the linear field in sigma(M)",
     .source = "common practice"},
};
const size_t ew_spectrum_row_count = sizeof ew_spectrum_rows / sizeof *ew_spectrum_rows;

static ew_status check_real(const ew_parameter *row, const void *field, ew_error *error) {
  double value;
  memcpy(&value, field, sizeof value);
  if (value >= row->low && value <= row->high)
    return EW_OK;
  return ew_fail(error, EW_REFUSED, "%s = %g is outside %g to %g", row->name, value, row->low, row->high);
}

static ew_status check_choice(const ew_parameter *row, const void *field, ew_error *error) {
  int value, count = 0;
  memcpy(&value, field, sizeof value);
  while (row->choices[count].name)
    count++;
  if (value >= 0 && value < count)
    return EW_OK;
  return ew_fail(error, EW_REFUSED, "%s = %d is none of its %d choices", row->name, value, count);
}

ew_status ew_rows_check(const ew_parameter *rows, size_t count, const void *target, ew_error *error) {
  ew_status status = EW_OK;
  for (size_t i = 0; status == EW_OK && i < count; i++) {
    const void *field = (const char *)target + rows[i].offset;
    if (rows[i].type == EW_REAL)
      status = check_real(&rows[i], field, error);
    else if (rows[i].type == EW_CHOICE)
      status = check_choice(&rows[i], field, error);
  }
  return status;
}
