/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The catalogue file: every row that the driver hands over becomes one entry in each column, tree by tree. */
#include "core/hdf.h"
#include "elfinwood/catalogue.h"

#include <stdlib.h>

enum { ROW_CHUNK = 512, LONGEST_NAME = 128 };

struct ew_catalogue {
  ew_hdf_file *file;
  ew_hdf_column **galaxies; /* [ew_galaxy_column_count] */
  ew_hdf_column **trees;    /* [ew_tree_column_count] */
};

/* ----------------------------------------------------------------------------------------------------------- create */

static ew_hdf_type hdf_type_of(ew_column_type type) {
  return type == EW_COLUMN_REAL ? EW_HDF_REAL : type == EW_COLUMN_INTEGER ? EW_HDF_INTEGER : EW_HDF_KEY;
}

static ew_status add_columns(ew_hdf_file *file, const char *group, const ew_column *columns, size_t count,
                             ew_hdf_column **made, ew_error *error) {
  ew_status status = EW_OK;
  for (size_t i = 0; i < count && status == EW_OK; i++) {
    char name[LONGEST_NAME];
    snprintf(name, sizeof name, "%s/%s", group, columns[i].name);
    const ew_hdf_column_header header = {
        name, hdf_type_of(columns[i].type), 1, ROW_CHUNK, columns[i].unit, columns[i].meaning};
    status = ew_hdf_add_column(&made[i], file, &header, error);
  }
  return status;
}

static ew_status fill_header(ew_catalogue *catalogue, const ew_catalogue_header *header, ew_error *error) {
  ew_status status = ew_hdf_put_text(catalogue->file, "parameters", header->parameter_text, error);
  if (status == EW_OK)
    status = ew_hdf_put_key(catalogue->file, "seed", header->seed, error);
  if (status == EW_OK)
    status = add_columns(catalogue->file, "/galaxies", ew_galaxy_columns, ew_galaxy_column_count, catalogue->galaxies,
                         error);
  if (status == EW_OK)
    status = add_columns(catalogue->file, "/trees", ew_tree_columns, ew_tree_column_count, catalogue->trees, error);
  return status == EW_OK ? ew_hdf_begin(catalogue->file, error) : status;
}

static ew_status open_file(ew_catalogue *catalogue, const char *path, const ew_catalogue_header *header,
                           ew_error *error) {
  catalogue->galaxies = calloc(ew_galaxy_column_count, sizeof(ew_hdf_column *));
  catalogue->trees = calloc(ew_tree_column_count, sizeof(ew_hdf_column *));
  if (!catalogue->galaxies || !catalogue->trees)
    return ew_fail_memory(error, "a catalogue");
  ew_status status = ew_hdf_create(&catalogue->file, path, error);
  return status == EW_OK ? fill_header(catalogue, header, error) : status;
}

ew_status ew_catalogue_create(ew_catalogue **catalogue, const char *path, const ew_catalogue_header *header,
                              ew_error *error) {
  *catalogue = NULL;
  ew_catalogue *made = calloc(1, sizeof *made);
  if (!made)
    return ew_fail_memory(error, "a catalogue");
  ew_status status = open_file(made, path, header, error);
  if (status != EW_OK) {
    ew_catalogue_close(made);
    return status;
  }
  *catalogue = made;
  return EW_OK;
}

/* ------------------------------------------------------------------------------------------------------------- rows */

static ew_status push_row(ew_hdf_column *const *made, const ew_column *columns, size_t count, const void *row,
                          ew_error *error) {
  ew_status status = EW_OK;
  for (size_t i = 0; i < count && status == EW_OK; i++)
    status = ew_hdf_push(made[i], (const char *)row + columns[i].offset, 1, error);
  return status;
}

static ew_status take(void *context, const ew_tree_row *tree, const ew_galaxy_row *rows, size_t count,
                      ew_error *error) {
  const ew_catalogue *catalogue = context;
  ew_status status = push_row(catalogue->trees, ew_tree_columns, ew_tree_column_count, tree, error);
  for (size_t i = 0; i < count && status == EW_OK; i++)
    status = push_row(catalogue->galaxies, ew_galaxy_columns, ew_galaxy_column_count, &rows[i], error);
  return status == EW_OK ? ew_hdf_seal(catalogue->file, error) : status;
}

ew_row_sink ew_catalogue_sink(ew_catalogue *catalogue) {
  return (ew_row_sink){take, catalogue};
}

/* ------------------------------------------------------------------------------------------------------------ close */

uint64_t ew_catalogue_kept(ew_catalogue *catalogue) {
  return ew_hdf_kept_rows(catalogue->trees[0]);
}

ew_status ew_catalogue_finish(ew_catalogue *catalogue, ew_error *error) {
  return ew_hdf_finish(catalogue->file, error);
}

void ew_catalogue_close(ew_catalogue *catalogue) {
  if (!catalogue)
    return;
  ew_hdf_close(catalogue->file);
  free(catalogue->galaxies);
  free(catalogue->trees);
  free(catalogue);
}
