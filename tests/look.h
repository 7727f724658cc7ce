/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * For tests of files: a temporary folder, and HDF5 files looked at by HDF5's own calls. Everything here stops the test
 * when a file is not as it must be to be looked at. */
#ifndef EW_TESTS_LOOK_H
#define EW_TESTS_LOOK_H

#include <limits.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include <cmocka.h>
#include <hdf5.h>

/* ----------------------------------------------------------------------------------------------------------- folder */

typedef struct {
  char path[PATH_MAX];
} look_path;

/* A new folder, to be removed by look_remove_folder. */
static inline look_path look_make_folder(void) {
  look_path folder;
  const char *parent = getenv("TMPDIR");
  snprintf(folder.path, sizeof folder.path, "%s/elfinwood-XXXXXX", parent && *parent ? parent : "/tmp");
  assert_non_null(mkdtemp(folder.path));
  return folder;
}

static inline void look_remove_folder(look_path folder) {
  char command[PATH_MAX + 16];
  snprintf(command, sizeof command, "rm -rf '%s'", folder.path);
  assert_int_equal(system(command), 0);
}

static inline look_path look_join(look_path folder, const char *name) {
  look_path path;
  assert_in_range(snprintf(path.path, sizeof path.path, "%s/%s", folder.path, name), 1, PATH_MAX - 1);
  return path;
}

static inline bool look_exists(look_path path) {
  struct stat found;
  return lstat(path.path, &found) == 0;
}

static inline void look_write_text(look_path path, const char *text) {
  FILE *file = fopen(path.path, "w");
  assert_non_null(file);
  assert_true(fputs(text, file) >= 0);
  assert_int_equal(fclose(file), 0);
}

/* The whole file; free it. */
static inline char *look_read_text(look_path path) {
  enum { LARGEST = 1 << 20 };
  FILE *file = fopen(path.path, "r");
  assert_non_null(file);
  char *text = calloc(1, LARGEST);
  assert_non_null(text);
  size_t size = fread(text, 1, LARGEST - 1, file);
  assert_true(size < LARGEST - 1);
  fclose(file);
  return text;
}

/* ------------------------------------------------------------------------------------------------------------- HDF5 */

static inline hid_t look_open(look_path path) {
  hid_t file = H5Fopen(path.path, H5F_ACC_RDONLY, H5P_DEFAULT);
  if (file < 0)
    fail_msg("%s cannot be opened", path.path);
  return file;
}

/* Every type that the files use is read as 8 bytes without conversion of its kind. */
static inline hid_t look_memory_type(hid_t object_type) {
  assert_int_equal(H5Tget_size(object_type), 8);
  if (H5Tget_class(object_type) == H5T_FLOAT)
    return H5T_NATIVE_DOUBLE;
  assert_int_equal(H5Tget_class(object_type), H5T_INTEGER);
  return H5Tget_sign(object_type) == H5T_SGN_2 ? H5T_NATIVE_INT64 : H5T_NATIVE_UINT64;
}

/* All values of a dataset, how many to *count (NULL: not wanted); free them. */
static inline void *look_values(hid_t file, const char *name, size_t *count) {
  hid_t dataset = H5Dopen2(file, name, H5P_DEFAULT);
  if (dataset < 0)
    fail_msg("no dataset %s", name);
  hid_t space = H5Dget_space(dataset), type = H5Dget_type(dataset);
  size_t size = (size_t)H5Sget_simple_extent_npoints(space);
  void *values = calloc(size + 1, 8);
  assert_non_null(values);
  if (H5Dread(dataset, look_memory_type(type), H5S_ALL, H5S_ALL, H5P_DEFAULT, values) < 0)
    fail_msg("%s cannot be read", name);
  if (count)
    *count = size;
  H5Tclose(type);
  H5Sclose(space);
  H5Dclose(dataset);
  return values;
}

static inline double *look_reals(hid_t file, const char *name, size_t *count) {
  return look_values(file, name, count);
}

static inline int64_t *look_integers(hid_t file, const char *name, size_t *count) {
  return look_values(file, name, count);
}

static inline size_t look_count(hid_t file, const char *name) {
  size_t count;
  free(look_values(file, name, &count));
  return count;
}

/* 8 bytes of an attribute of the object ("/" for the file) into `value`. */
static inline void look_attribute(hid_t file, const char *object, const char *name, void *value) {
  hid_t attribute = H5Aopen_by_name(file, object, name, H5P_DEFAULT, H5P_DEFAULT);
  if (attribute < 0)
    fail_msg("%s has no attribute %s", object, name);
  hid_t type = H5Aget_type(attribute);
  assert_true(H5Aread(attribute, look_memory_type(type), value) >= 0);
  H5Tclose(type);
  H5Aclose(attribute);
}

static inline int64_t look_integer_attribute(hid_t file, const char *name) {
  int64_t value;
  look_attribute(file, "/", name, &value);
  return value;
}

/* A text of fixed length; free it. */
static inline char *look_text_attribute(hid_t file, const char *object, const char *name) {
  hid_t attribute = H5Aopen_by_name(file, object, name, H5P_DEFAULT, H5P_DEFAULT);
  if (attribute < 0)
    fail_msg("%s has no attribute %s", object, name);
  hid_t type = H5Aget_type(attribute);
  assert_int_equal(H5Tget_class(type), H5T_STRING);
  assert_false(H5Tis_variable_str(type));
  char *text = calloc(1, H5Tget_size(type) + 1);
  assert_non_null(text);
  assert_true(H5Aread(attribute, type, text) >= 0);
  H5Tclose(type);
  H5Aclose(attribute);
  return text;
}

/* ------------------------------------------------------------------------------------------------------ comparisons */

typedef struct {
  hid_t other;
  size_t datasets;
} look_comparison;

/* The dataset is a prefix of the one of that name in the other file, bit for bit; NaN equals NaN. */
static inline herr_t look_compare(hid_t file, const char *name, const H5O_info_t *info, void *context) {
  look_comparison *comparison = context;
  if (info->type != H5O_TYPE_DATASET)
    return 0;
  size_t count, other_count;
  void *values = look_values(file, name, &count), *others = look_values(comparison->other, name, &other_count);
  if (count > other_count || memcmp(values, others, count * 8) != 0)
    fail_msg("%s differs (%zu values, %zu in the other file)", name, count, other_count);
  free(values);
  free(others);
  comparison->datasets++;
  return 0;
}

/* Every dataset of one file is a prefix of its namesake in the other; how many there are. */
static inline size_t look_assert_prefix(look_path path, look_path other) {
  hid_t file = look_open(path);
  look_comparison comparison = {look_open(other), 0};
  assert_true(H5Ovisit1(file, H5_INDEX_NAME, H5_ITER_INC, look_compare, &comparison) >= 0);
  H5Fclose(file);
  H5Fclose(comparison.other);
  return comparison.datasets;
}

static inline void look_assert_equal(look_path path, look_path other) {
  size_t datasets = look_assert_prefix(path, other);
  assert_true(datasets > 0);
  assert_int_equal(look_assert_prefix(other, path), datasets);
}

#endif
