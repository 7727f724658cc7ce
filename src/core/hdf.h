/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * HDF5 files made of columns that grow together, written so that whatever goes wrong leaves whole records.
 *
 * Rows wait in memory; ew_hdf_seal says that all which waits now makes whole records. From time to time the sealed rows
 * of all columns are committed at once: room for them is taken on the disk first, then HDF5 gets them and is flushed.
 * Between commits HDF5 holds nothing back, so a full disk, an interruption or a kill leaves PATH.partial as of the last
 * commit, readable and with attribute `complete` = 0.
 *
 * An order of calls: create, add columns and attributes, begin; push and seal; finish; close. One thread at a time.
 * Failures are EW_FAILED and name PATH.partial; HDF5 itself prints nothing. */
#ifndef EW_CORE_HDF_H
#define EW_CORE_HDF_H

#include "elfinwood/core.h"

typedef struct ew_hdf_file ew_hdf_file;
typedef struct ew_hdf_column ew_hdf_column; /* lives as long as its file */

typedef enum { EW_HDF_REAL, EW_HDF_INTEGER, EW_HDF_KEY } ew_hdf_type; /* double, int64_t, uint64_t */

typedef struct {
  const char *name; /* "/galaxies/tree"; groups on the way are made */
  ew_hdf_type type;
  size_t width; /* values in a row; 1 makes a dataset of rank 1 */
  size_t chunk; /* rows that lie together in the file */
  const char *unit, *meaning;
} ew_hdf_column_header;

/* Opens PATH.partial (see core/output.h) with attributes `version`, `complete` = 0 and `written`, now in UTC. */
EW_CHECKED ew_status ew_hdf_create(ew_hdf_file **file, const char *path, ew_error *error);

/* For main, before anything else of HDF5: keeps its exit handler out, which crashes when a file could not be closed on
 * a full disk. Files must be closed by their owners then, as ours are. */
void ew_hdf_start(void);

/* Attributes of the file. */
EW_CHECKED ew_status ew_hdf_put_text(ew_hdf_file *file, const char *name, const char *text, ew_error *error);
EW_CHECKED ew_status ew_hdf_put_real(ew_hdf_file *file, const char *name, double value, ew_error *error);
EW_CHECKED ew_status ew_hdf_put_integer(ew_hdf_file *file, const char *name, int64_t value, ew_error *error);
EW_CHECKED ew_status ew_hdf_put_key(ew_hdf_file *file, const char *name, uint64_t value, ew_error *error);

EW_CHECKED ew_status ew_hdf_add_column(ew_hdf_column **column, ew_hdf_file *file, const ew_hdf_column_header *header,
                                       ew_error *error);

/* Brings what has been created to the disk: from here on there is a file to keep. */
EW_CHECKED ew_status ew_hdf_begin(ew_hdf_file *file, ew_error *error);

/* `values` holds rows * width values of the column's type. */
EW_CHECKED ew_status ew_hdf_push(ew_hdf_column *column, const void *values, size_t rows, ew_error *error);
EW_CHECKED ew_status ew_hdf_seal(ew_hdf_file *file, ew_error *error);

/* Commits what is sealed at once. After a commit that failed nothing more is written, and this fails. */
EW_CHECKED ew_status ew_hdf_commit(ew_hdf_file *file, ew_error *error);

/* Commits what is sealed if that can still be done; the rows of the column that PATH.partial holds. */
uint64_t ew_hdf_kept_rows(ew_hdf_column *column);

/* Commits, sets `complete` = 1, brings the file to the disk and renames it to PATH. */
EW_CHECKED ew_status ew_hdf_finish(ew_hdf_file *file, ew_error *error);

/* Without ew_hdf_finish: commits what is sealed if that can be done, and leaves PATH.partial, or removes it if begin
 * was never reached. Accepts NULL. */
void ew_hdf_close(ew_hdf_file *file);

#endif
