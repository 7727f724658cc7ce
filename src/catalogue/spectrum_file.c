/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The spectrum file: background, power spectrum, variance and mass functions on fixed grids. */
#include "core/hdf.h"
#include "elfinwood/catalogue.h"

#include <math.h>
#include <stdlib.h>

enum {
  BACKGROUND_COUNT = 501,           /* even in ln(1 + z) */
  PER_DECADE = 40,                  /* masses and wavenumbers */
  POWER_COUNT = 9 * PER_DECADE + 1, /* 1e-5 to 1e4 per Mpc */
  MASS_COUNT = 11 * PER_DECADE + 1, /* 1e4 to 1e15 Msun */
  LARGEST_COUNT = BACKGROUND_COUNT  /* of a row or column */
};

#define BACKGROUND_END    50.0 /* redshift */
#define LOWEST_WAVENUMBER -5
#define LOWEST_LOG_MASS   4

static const double function_redshift[] = {0, 0.5, 1, 2, 3, 4, 5, 6, 8, 10, 12, 15, 20};
enum { REDSHIFT_COUNT = sizeof function_redshift / sizeof function_redshift[0] };

static double redshift_of(size_t i) {
  return i == BACKGROUND_COUNT - 1 ? BACKGROUND_END : expm1(log1p(BACKGROUND_END) * (double)i / (BACKGROUND_COUNT - 1));
}

static double wavenumber_of(size_t i) {
  return pow(10.0, LOWEST_WAVENUMBER + (double)i / PER_DECADE);
}

static double mass_of(size_t i) {
  return pow(10.0, LOWEST_LOG_MASS + (double)i / PER_DECADE);
}

/* ---------------------------------------------------------------------------------------------------- plain columns */

static double redshift(const ew_spectrum *spectrum, size_t i) {
  (void)spectrum;
  return redshift_of(i);
}

static double age(const ew_spectrum *spectrum, size_t i) {
  return ew_age(ew_spectrum_cosmology(spectrum), redshift_of(i));
}

static double hubble_rate(const ew_spectrum *spectrum, size_t i) {
  return ew_hubble_rate(ew_spectrum_cosmology(spectrum), redshift_of(i));
}

static double comoving_distance(const ew_spectrum *spectrum, size_t i) {
  return ew_comoving_distance(ew_spectrum_cosmology(spectrum), redshift_of(i));
}

static double luminosity_distance(const ew_spectrum *spectrum, size_t i) {
  return ew_luminosity_distance(ew_spectrum_cosmology(spectrum), redshift_of(i));
}

static double growth(const ew_spectrum *spectrum, size_t i) {
  return ew_growth(ew_spectrum_cosmology(spectrum), redshift_of(i));
}

static double wavenumber(const ew_spectrum *spectrum, size_t i) {
  (void)spectrum;
  return wavenumber_of(i);
}

static double transfer(const ew_spectrum *spectrum, size_t i) {
  return ew_transfer_at(spectrum, wavenumber_of(i));
}

static double power(const ew_spectrum *spectrum, size_t i) {
  return ew_power_at(spectrum, wavenumber_of(i));
}

static double mass(const ew_spectrum *spectrum, size_t i) {
  (void)spectrum;
  return mass_of(i);
}

static double sigma(const ew_spectrum *spectrum, size_t i) {
  return ew_sigma(spectrum, mass_of(i));
}

static double slope(const ew_spectrum *spectrum, size_t i) {
  return ew_sigma_slope(spectrum, mass_of(i));
}

static double mass_function_redshift(const ew_spectrum *spectrum, size_t i) {
  (void)spectrum;
  return function_redshift[i];
}

static const struct {
  const char *name;
  size_t count;
  double (*value)(const ew_spectrum *spectrum, size_t i);
  const char *unit, *meaning;
} plain[] = {
    {"/background/redshift", BACKGROUND_COUNT, redshift, "1", "redshift, even in ln(1 + z)"},
    {"/background/time", BACKGROUND_COUNT, age, "Gyr", "age of the universe"},
    {"/background/hubble_rate", BACKGROUND_COUNT, hubble_rate, "km/s/Mpc", "Hubble rate"},
    {"/background/comoving_distance", BACKGROUND_COUNT, comoving_distance, "Mpc", "comoving distance"},
    {"/background/luminosity_distance", BACKGROUND_COUNT, luminosity_distance, "Mpc", "luminosity distance"},
    {"/background/growth", BACKGROUND_COUNT, growth, "1", "linear growth factor, 1 at redshift 0"},
    {"/power/wavenumber", POWER_COUNT, wavenumber, "1/Mpc", "comoving wavenumber"},
    {"/power/transfer", POWER_COUNT, transfer, "1", "transfer function"},
    {"/power/power", POWER_COUNT, power, "Mpc^3", "linear power spectrum at redshift 0"},
    {"/variance/mass", MASS_COUNT, mass, "Msun", "mass within the filter at mean density"},
    {"/variance/sigma", MASS_COUNT, sigma, "1", "rms of the linear density contrast at redshift 0"},
    {"/variance/slope", MASS_COUNT, slope, "1", "dln(sigma)/dln(mass)"},
    {"/mass_function/mass", MASS_COUNT, mass, "Msun", "halo mass"},
    {"/mass_function/redshift", REDSHIFT_COUNT, mass_function_redshift, "1", "redshift"},
};

static ew_status write_plain(ew_hdf_file *file, const ew_spectrum *spectrum, ew_error *error) {
  ew_status status = EW_OK;
  for (size_t c = 0; c < sizeof plain / sizeof plain[0] && status == EW_OK; c++) {
    double values[LARGEST_COUNT];
    for (size_t i = 0; i < plain[c].count; i++)
      values[i] = plain[c].value(spectrum, i);
    const ew_hdf_column_header header = {plain[c].name,  EW_HDF_REAL,   1,
                                         plain[c].count, plain[c].unit, plain[c].meaning};
    ew_hdf_column *column;
    status = ew_hdf_add_column(&column, file, &header, error);
    if (status == EW_OK)
      status = ew_hdf_push(column, values, plain[c].count, error);
  }
  return status;
}

/* --------------------------------------------------------------------------------------------------- mass functions */

static ew_status write_mass_function(ew_hdf_file *file, const char *name, const ew_mass_function *function,
                                     const ew_spectrum *spectrum, ew_error *error) {
  const ew_hdf_column_header header = {name,           EW_HDF_REAL, MASS_COUNT,
                                       REDSHIFT_COUNT, "Mpc^-3",    "dn/dln(mass), comoving, redshift by mass"};
  ew_hdf_column *column;
  ew_status status = ew_hdf_add_column(&column, file, &header, error);
  for (size_t z = 0; z < REDSHIFT_COUNT && status == EW_OK; z++) {
    double values[MASS_COUNT];
    for (size_t i = 0; i < MASS_COUNT; i++)
      values[i] = ew_mass_function_at(function, spectrum, mass_of(i), function_redshift[z]);
    status = ew_hdf_push(column, values, 1, error);
  }
  return status;
}

static ew_status write_spectrum(ew_hdf_file *file, const ew_spectrum *spectrum, const char *parameter_text,
                                ew_error *error) {
  ew_status status = ew_hdf_put_text(file, "parameters", parameter_text, error);
  if (status == EW_OK)
    status = write_plain(file, spectrum, error);
  if (status == EW_OK)
    status = write_mass_function(file, "/mass_function/press_schechter", &ew_press_schechter, spectrum, error);
  if (status == EW_OK)
    status = write_mass_function(file, "/mass_function/sheth_tormen", &ew_sheth_tormen, spectrum, error);
  if (status == EW_OK)
    status = ew_hdf_begin(file, error);
  if (status == EW_OK)
    status = ew_hdf_seal(file, error);
  return status == EW_OK ? ew_hdf_finish(file, error) : status;
}

ew_status ew_spectrum_write(const ew_spectrum *spectrum, const char *path, const char *parameter_text,
                            ew_error *error) {
  ew_hdf_file *file;
  ew_status status = ew_hdf_create(&file, path, error);
  if (status == EW_OK)
    status = write_spectrum(file, spectrum, parameter_text, error);
  ew_hdf_close(file);
  return status;
}
