/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * catalogue: rows as files and as tables for people - the column table, the HDF5 writer, the spectrum file, the closing
 * summary. */
#ifndef ELFINWOOD_CATALOGUE_H
#define ELFINWOOD_CATALOGUE_H

#include "elfinwood/population.h"

/* ---------------------------------------------------------------------------------------------------------- columns */

typedef enum { EW_COLUMN_REAL, EW_COLUMN_INTEGER, EW_COLUMN_KEY } ew_column_type; /* double, int64_t, uint64_t */

typedef struct {
  const char *name;
  ew_column_type type;
  size_t offset; /* in ew_galaxy_row, or ew_tree_row */
  const char *unit;
  const char *meaning;
} ew_column;

extern const ew_column ew_galaxy_columns[];
extern const size_t ew_galaxy_column_count;
extern const ew_column ew_tree_columns[];
extern const size_t ew_tree_column_count;

/* ---------------------------------------------------------------------------------------------------------- writer */

typedef struct ew_catalogue ew_catalogue;

typedef struct {
  const char *parameter_text; /* the resolved parameters, libconfig text that runs again */
  uint64_t seed;
} ew_catalogue_header;

/* Opens PATH.partial with /galaxies and /trees; rows arrive through ew_catalogue_sink in tree order.
 * ew_catalogue_finish sets `complete` = 1, flushes to disk and renames to PATH. ew_catalogue_close without it leaves
 * PATH.partial, readable, with whole trees and `complete` = 0. An existing PATH is not touched before the rename. */
EW_CHECKED ew_status ew_catalogue_create(ew_catalogue **catalogue, const char *path, const ew_catalogue_header *header,
                                         ew_error *error);
ew_row_sink ew_catalogue_sink(ew_catalogue *catalogue);
EW_CHECKED ew_status ew_catalogue_finish(ew_catalogue *catalogue, ew_error *error);
void ew_catalogue_close(ew_catalogue *catalogue); /* accepts NULL */

/* Brings to the disk what it can; the number of whole trees that the file holds. */
uint64_t ew_catalogue_kept(ew_catalogue *catalogue);

/* ---------------------------------------------------------------------------------------------------- spectrum file */

/* Writes /background, /power, /variance and /mass_function as PATH.partial, then renames. */
EW_CHECKED ew_status ew_spectrum_write(const ew_spectrum *spectrum, const char *path, const char *parameter_text,
                                       ew_error *error);

/* --------------------------------------------------------------------------------------------------------- summary */

/* Collects what the closing tables need while rows pass by, in memory that does not grow with their number. Only
 * central galaxies count, each with its weight. Quantiles are good to 0.004 dex or better (time_90: 5 Myr). */
typedef struct ew_summary ew_summary;
ew_summary *ew_summary_new(void); /* NULL when memory is short */
void ew_summary_free(ew_summary *summary);
void ew_summary_add(ew_summary *summary, const ew_galaxy_row *rows, size_t count);

/* By decade of luminosity: number, median and 16-84 % of [Fe/H], half-light radius, dispersion and time_90; and by
 * half-decade of halo mass: number, luminous share, median stellar mass of the luminous ones. The caller checks `out`
 * for write errors. */
void ew_summary_print(const ew_summary *summary, FILE *out);

#endif
