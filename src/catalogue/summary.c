/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The closing tables: central galaxies by decade of luminosity and haloes by half-decade of mass. Rows are only counted
 * into cells, so memory is the same for any number of them. */
#include "catalogue/distribution.h"
#include "elfinwood/catalogue.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum {
  LUMINOSITY_BINS = 13, /* below 1 Lsun, then decades; the last one is open */
  MASS_BINS = 24,       /* half-decades from 1e4 Msun; the first and last are open */
  LOWEST_LOG_MASS = 4
};

/* A column of the first table. */
typedef struct {
  const char *name, *unit;
  double (*value)(const ew_observables *observed);
  bool logarithmic; /* cells are even in log10 */
  ew_distribution_range range;
  int width; /* on the page */
} quantity;

static double metallicity(const ew_observables *observed) {
  return observed->metallicity;
}

static double half_light_radius(const ew_observables *observed) {
  return observed->half_light_radius;
}

static double velocity_dispersion(const ew_observables *observed) {
  return observed->velocity_dispersion;
}

static double time_90(const ew_observables *observed) {
  return observed->time_90;
}

static const quantity quantities[] = {
    {"[Fe/H]", "dex", metallicity, false, {-12.0, 4.0}, 19},
    {"half-light radius", "pc", half_light_radius, true, {-2.0, 6.0}, 17},
    {"dispersion", "km/s", velocity_dispersion, true, {-3.0, 5.0}, 17},
    {"time_90", "Gyr", time_90, false, {0.0, 20.0}, 19},
};
enum { QUANTITY_COUNT = sizeof quantities / sizeof quantities[0] };

static const ew_distribution_range stellar_mass_range = {-4.0, 12.0}; /* log10 Msun */

typedef struct {
  double number;
  ew_distribution of[QUANTITY_COUNT];
} luminosity_bin;

typedef struct {
  double number, luminous;
  ew_distribution stellar_mass;
} mass_bin;

struct ew_summary {
  double starless;
  luminosity_bin by_luminosity[LUMINOSITY_BINS];
  mass_bin by_mass[MASS_BINS];
};

ew_summary *ew_summary_new(void) {
  return calloc(1, sizeof(ew_summary));
}

void ew_summary_free(ew_summary *summary) {
  free(summary);
}

/* ------------------------------------------------------------------------------------------------------- collecting */

/* floor(x) among bins 0..count - 1; what lies outside goes to the nearest. */
static size_t bin_of(double x, size_t count) {
  double last = (double)(count - 1);
  return x > 0.0 ? (size_t)(x < last ? x : last) : 0;
}

static void count_luminosity(ew_summary *summary, const ew_galaxy_row *row) {
  luminosity_bin *bin = &summary->by_luminosity[bin_of(1.0 + log10(row->observed.luminosity_v), LUMINOSITY_BINS)];
  bin->number += row->weight;
  for (size_t i = 0; i < QUANTITY_COUNT; i++) {
    double value = quantities[i].value(&row->observed);
    ew_distribution_add(&bin->of[i], quantities[i].range, quantities[i].logarithmic ? log10(value) : value,
                        row->weight);
  }
}

static void count_row(ew_summary *summary, const ew_galaxy_row *row) {
  bool luminous = row->observed.luminosity_v > 0.0;
  mass_bin *bin = &summary->by_mass[bin_of(2.0 * (log10(row->halo_mass) - LOWEST_LOG_MASS), MASS_BINS)];
  bin->number += row->weight;
  if (!luminous) {
    summary->starless += row->weight;
    return;
  }
  bin->luminous += row->weight;
  ew_distribution_add(&bin->stellar_mass, stellar_mass_range, log10(row->observed.stellar_mass), row->weight);
  count_luminosity(summary, row);
}

void ew_summary_add(ew_summary *summary, const ew_galaxy_row *rows, size_t count) {
  for (size_t i = 0; i < count; i++)
    if (rows[i].central)
      count_row(summary, &rows[i]);
}

/* --------------------------------------------------------------------------------------------------------- printing */

enum { LABEL_SIZE = 32, CELL_SIZE = 64, LABEL_WIDTH = 12, NUMBER_WIDTH = 8 };

/* Three digits, two of them decimals at most. */
static int decimals_for(double value) {
  double size = fabs(value);
  return size < 9.995 ? 2 : size < 99.95 ? 1 : 0;
}

static void cell_text(char text[CELL_SIZE], const quantity *what, const ew_distribution *distribution) {
  static const double shares[3] = {0.5, 0.16, 0.84};
  double value[3];
  for (size_t i = 0; i < 3; i++) {
    value[i] = ew_distribution_quantile(distribution, shares[i]);
    value[i] = what->logarithmic ? pow(10.0, value[i]) : value[i];
  }
  if (distribution->total > 0.0)
    snprintf(text, CELL_SIZE, "%.*f (%.*f %.*f)", decimals_for(value[0]), value[0], decimals_for(value[1]), value[1],
             decimals_for(value[2]), value[2]);
  else
    snprintf(text, CELL_SIZE, "-");
}

/* Weights are whole numbers unless the user gave others. */
static void print_label(const char *label, double number, FILE *out) {
  fprintf(out, "%-*s %*.*f", LABEL_WIDTH, label, NUMBER_WIDTH, number == floor(number) ? 0 : 2, number);
}

static void print_luminosity_bin(const luminosity_bin *bin, size_t index, FILE *out) {
  char label[LABEL_SIZE];
  if (index == 0)
    snprintf(label, sizeof label, "below 1");
  else
    snprintf(label, sizeof label, "1e%zu - 1e%zu", index - 1, index);
  print_label(label, bin->number, out);
  for (size_t i = 0; i < QUANTITY_COUNT; i++) {
    char text[CELL_SIZE];
    cell_text(text, &quantities[i], &bin->of[i]);
    fprintf(out, "  %-*s", i + 1 < QUANTITY_COUNT ? quantities[i].width : 0, text);
  }
  fputc('\n', out);
}

static void print_by_luminosity(const ew_summary *summary, FILE *out) {
  fputs("Galaxies by V luminosity: median (16 and 84 per cent)\n", out);
  fprintf(out, "%-*s %*s", LABEL_WIDTH, "luminosity", NUMBER_WIDTH, "number");
  for (size_t i = 0; i < QUANTITY_COUNT; i++)
    fprintf(out, "  %-*s", i + 1 < QUANTITY_COUNT ? quantities[i].width : 0, quantities[i].name);
  fprintf(out, "\n%-*s %*s", LABEL_WIDTH, "[Lsun]", NUMBER_WIDTH, "");
  for (size_t i = 0; i < QUANTITY_COUNT; i++)
    fprintf(out, "  [%s]%*s", quantities[i].unit,
            i + 1 < QUANTITY_COUNT ? quantities[i].width - 2 - (int)strlen(quantities[i].unit) : 0, "");
  fputc('\n', out);
  if (summary->starless > 0.0) {
    print_label("no stars", summary->starless, out);
    fputc('\n', out);
  }
  for (size_t i = 0; i < LUMINOSITY_BINS; i++)
    if (summary->by_luminosity[i].number > 0.0)
      print_luminosity_bin(&summary->by_luminosity[i], i, out);
}

static void print_mass_bin(const mass_bin *bin, size_t index, FILE *out) {
  char label[LABEL_SIZE], mass[CELL_SIZE] = "-";
  int decade = LOWEST_LOG_MASS + (int)index / 2;
  if (index % 2 == 0)
    snprintf(label, sizeof label, "1e%d - 3e%d", decade, decade);
  else
    snprintf(label, sizeof label, "3e%d - 1e%d", decade, decade + 1);
  print_label(label, bin->number, out);
  if (bin->luminous > 0.0)
    snprintf(mass, sizeof mass, "%.2e", pow(10.0, ew_distribution_quantile(&bin->stellar_mass, 0.5)));
  fprintf(out, "  %8.3f  %s\n", bin->luminous / bin->number, mass);
}

static void print_by_mass(const ew_summary *summary, FILE *out) {
  fputs("\nHaloes by mass (3 stands for 3.16), and the median stellar mass of those with stars\n", out);
  fprintf(out, "%-*s %*s  %8s  %s\n", LABEL_WIDTH, "halo mass", NUMBER_WIDTH, "number", "luminous", "stellar mass");
  fprintf(out, "%-*s %*s  %8s  %s\n", LABEL_WIDTH, "[Msun]", NUMBER_WIDTH, "", "share", "[Msun]");
  for (size_t i = 0; i < MASS_BINS; i++)
    if (summary->by_mass[i].number > 0.0)
      print_mass_bin(&summary->by_mass[i], i, out);
}

void ew_summary_print(const ew_summary *summary, FILE *out) {
  print_by_luminosity(summary, out);
  print_by_mass(summary, out);
}
