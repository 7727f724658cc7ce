/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Files of columns: what goes in comes out, and whatever goes wrong leaves whole records. Failures happen in child
 * processes: a file that may not grow further stands for a full disk, a kill for a power cut. */
#include "core/hdf.h"
#include "folder.h"

#include <signal.h>
#include <sys/resource.h>
#include <sys/wait.h>

enum { WIDTH = 3, PER_RECORD = 5, CHUNK = 64 };

typedef struct {
  ew_hdf_file *file;
  ew_hdf_column *number, *value, *wide;
} sample;

static const ew_hdf_column_header number_header = {"/records/number", EW_HDF_INTEGER, 1, CHUNK, "1", "its number"};
static const ew_hdf_column_header value_header = {"/values/value", EW_HDF_REAL, 1, CHUNK, "Msun", "five to a record"};
static const ew_hdf_column_header wide_header = {"/values/wide", EW_HDF_KEY, WIDTH, CHUNK, "1", "one row to a record"};

static ew_status create(sample *made, const char *path, ew_error *error) {
  *made = (sample){0};
  ew_status status = ew_hdf_create(&made->file, path, error);
  if (status == EW_OK)
    status = ew_hdf_add_column(&made->number, made->file, &number_header, error);
  if (status == EW_OK)
    status = ew_hdf_add_column(&made->value, made->file, &value_header, error);
  if (status == EW_OK)
    status = ew_hdf_add_column(&made->wide, made->file, &wide_header, error);
  return status == EW_OK ? ew_hdf_begin(made->file, error) : status;
}

/* Values that depend on the record alone. */
static double value_of(int64_t record, size_t i) {
  return 2.385 * (double)record + 0.1 * (double)i;
}

static uint64_t wide_of(int64_t record, size_t i) {
  return UINT64_MAX - (uint64_t)(WIDTH * record) - i;
}

static ew_status push(sample *to, int64_t record, ew_error *error) {
  double values[PER_RECORD];
  uint64_t wide[WIDTH];
  for (size_t i = 0; i < PER_RECORD; i++)
    values[i] = value_of(record, i);
  for (size_t i = 0; i < WIDTH; i++)
    wide[i] = wide_of(record, i);
  ew_status status = ew_hdf_push(to->number, &record, 1, error);
  if (status == EW_OK)
    status = ew_hdf_push(to->value, values, PER_RECORD, error);
  return status == EW_OK ? ew_hdf_push(to->wide, wide, 1, error) : status;
}

/* The file holds whole records 0, 1, 2, ...; how many. */
static size_t assert_whole_records(hid_t file) {
  size_t records, values, wides;
  int64_t *number = look_integers(file, "/records/number", &records);
  double *value = look_reals(file, "/values/value", &values);
  uint64_t *wide = look_values(file, "/values/wide", &wides);
  assert_int_equal(values, PER_RECORD * records);
  assert_int_equal(wides, WIDTH * records);
  for (size_t r = 0; r < records; r++) {
    assert_int_equal(number[r], r);
    for (size_t i = 0; i < PER_RECORD; i++)
      assert_true(value[PER_RECORD * r + i] == value_of((int64_t)r, i));
    for (size_t i = 0; i < WIDTH; i++)
      assert_int_equal(wide[WIDTH * r + i], wide_of((int64_t)r, i));
  }
  free(number);
  free(value);
  free(wide);
  return records;
}

static size_t assert_records_in(look_path path, int64_t complete) {
  hid_t file = look_open(path);
  assert_int_equal(look_integer_attribute(file, "complete"), complete);
  size_t records = assert_whole_records(file);
  H5Fclose(file);
  return records;
}

/* ------------------------------------------------------------------------------------------------------------ whole */

static void test_rows_come_back_with_unit_meaning_and_attributes(void **state) {
  (void)state;
  enum { RECORDS = 1000 };
  look_path path = look_join(folder, "whole.h5");
  ew_error error = {0};
  sample made;
  assert_int_equal(create(&made, path.path, &error), EW_OK);
  assert_int_equal(ew_hdf_put_text(made.file, "parameters", "line 1\nline 2\n", &error), EW_OK);
  assert_int_equal(ew_hdf_put_real(made.file, "hubble", 0.6736, &error), EW_OK);
  assert_int_equal(ew_hdf_put_key(made.file, "seed", UINT64_MAX, &error), EW_OK);
  for (int64_t record = 0; record < RECORDS; record++) {
    assert_int_equal(push(&made, record, &error), EW_OK);
    assert_int_equal(ew_hdf_seal(made.file, &error), EW_OK);
  }
  assert_false(look_exists(path));
  assert_int_equal(ew_hdf_finish(made.file, &error), EW_OK);
  assert_int_equal(ew_hdf_kept_rows(made.number), RECORDS);
  ew_hdf_close(made.file);
  assert_false(look_exists(look_join(folder, "whole.h5.partial")));
  assert_int_equal(assert_records_in(path, 1), RECORDS);

  hid_t file = look_open(path);
  char *texts[] = {look_text_attribute(file, "/", "parameters"), look_text_attribute(file, "/values/value", "unit"),
                   look_text_attribute(file, "/values/value", "meaning"), look_text_attribute(file, "/", "version"),
                   look_text_attribute(file, "/", "written")};
  assert_string_equal(texts[0], "line 1\nline 2\n");
  assert_string_equal(texts[1], "Msun");
  assert_string_equal(texts[2], "five to a record");
  assert_string_equal(texts[3], ew_version());
  assert_int_equal(strlen(texts[4]), strlen("2000-01-01T00:00:00Z"));
  double hubble;
  uint64_t seed;
  look_attribute(file, "/", "hubble", &hubble);
  look_attribute(file, "/", "seed", &seed);
  assert_true(hubble == 0.6736 && seed == UINT64_MAX);
  for (size_t i = 0; i < sizeof texts / sizeof texts[0]; i++)
    free(texts[i]);
  H5Fclose(file);
}

static void test_rows_that_are_not_sealed_are_not_written(void **state) {
  (void)state;
  look_path partial = look_join(folder, "open.h5.partial");
  ew_error error = {0};
  sample made;
  assert_int_equal(create(&made, look_join(folder, "open.h5").path, &error), EW_OK);
  for (int64_t record = 0; record < 7; record++)
    assert_int_equal(push(&made, record, &error), EW_OK);
  assert_int_equal(ew_hdf_seal(made.file, &error), EW_OK);
  int64_t half_a_record = 7;
  assert_int_equal(ew_hdf_push(made.number, &half_a_record, 1, &error), EW_OK);
  assert_int_equal(ew_hdf_kept_rows(made.number), 7);
  ew_hdf_close(made.file);
  assert_false(look_exists(look_join(folder, "open.h5")));
  assert_int_equal(assert_records_in(partial, 0), 7);
}

static void test_a_file_that_never_began_leaves_nothing(void **state) {
  (void)state;
  ew_error error = {0};
  ew_hdf_file *file;
  assert_int_equal(ew_hdf_create(&file, look_join(folder, "none.h5").path, &error), EW_OK);
  assert_true(look_exists(look_join(folder, "none.h5.partial")));
  ew_hdf_close(file);
  assert_false(look_exists(look_join(folder, "none.h5.partial")));
  ew_hdf_close(NULL);
}

static void test_the_file_is_locked_while_it_is_written(void **state) {
  (void)state;
  look_path path = look_join(folder, "busy.h5");
  ew_error error = {0};
  ew_hdf_file *first, *second;
  assert_int_equal(ew_hdf_create(&first, path.path, &error), EW_OK);
  assert_int_equal(ew_hdf_create(&second, path.path, &error), EW_FAILED);
  assert_non_null(strstr(error.message, "another program is writing it"));
  assert_null(second);
  ew_hdf_close(first);
}

static herr_t report(hid_t stack, void *context) {
  (void)stack;
  (*(int *)context)++;
  return 0;
}

static void test_the_caller_keeps_its_hdf5_error_report(void **state) {
  (void)state;
  ew_error error = {0};
  ew_hdf_file *file;
  H5E_auto2_t after;
  void *context;
  int reports = 0;
  assert_true(H5Eset_auto2(H5E_DEFAULT, report, &reports) >= 0);
  assert_int_equal(ew_hdf_create(&file, look_join(folder, "report.h5").path, &error), EW_OK);
  ew_hdf_close(file);
  H5Eget_auto2(H5E_DEFAULT, &after, &context);
  assert_true(after == report && context == &reports && reports == 0);
  H5Eset_auto2(H5E_DEFAULT, NULL, NULL);
}

/* --------------------------------------------------------------------------------------------------------- failures */

/* Writes records until a call fails or all are written; the exit status is that of the first failure. */
static void write_in_child(const char *path, rlim_t largest) {
  enum { RECORDS = 20000 };
  const struct rlimit limit = {largest, largest};
  if (signal(SIGXFSZ, SIG_IGN) == SIG_ERR || setrlimit(RLIMIT_FSIZE, &limit) != 0)
    _exit(9);
  ew_hdf_start();
  ew_error error = {0};
  sample made;
  ew_status status = create(&made, path, &error);
  for (int64_t record = 0; record < RECORDS && status == EW_OK; record++) {
    status = push(&made, record, &error);
    if (status == EW_OK)
      status = ew_hdf_seal(made.file, &error);
  }
  if (status == EW_OK)
    status = ew_hdf_finish(made.file, &error);
  if (status != EW_OK && !strstr(error.message, "File too large"))
    status = 8;
  ew_hdf_close(made.file);
  exit((int)status);
}

static int status_of(pid_t child) {
  int status;
  assert_int_equal(waitpid(child, &status, 0), child);
  return WIFEXITED(status) ? WEXITSTATUS(status) : 128 + WTERMSIG(status);
}

/* 20000 records take 1.4 MB. With every limit below, the file is absent or whole up to some record. */
static void test_a_full_disk_leaves_whole_records(void **state) {
  (void)state;
  look_path path = look_join(folder, "full.h5"), partial = look_join(folder, "full.h5.partial");
  size_t largest = 0, absent = 0;
  for (rlim_t limit = 512; limit < 1000000; limit += limit < 60000 ? 2531 : 70001) {
    pid_t child = fork();
    assert_true(child >= 0);
    if (child == 0)
      write_in_child(path.path, limit);
    assert_int_equal(status_of(child), EW_FAILED);
    assert_false(look_exists(path));
    if (look_exists(partial)) {
      size_t records = assert_records_in(partial, 0);
      assert_true(records >= largest);
      largest = records;
    } else {
      absent++;
    }
  }
  assert_true(absent > 0);
  assert_true(largest > 2000);
  pid_t child = fork();
  assert_true(child >= 0);
  if (child == 0)
    write_in_child(path.path, 4000000);
  assert_int_equal(status_of(child), EW_OK);
  assert_int_equal(assert_records_in(path, 1), 20000);
}

/* Killed with committed records in the file and others in memory. */
static void test_a_kill_leaves_what_was_committed(void **state) {
  (void)state;
  look_path path = look_join(folder, "killed.h5"), partial = look_join(folder, "killed.h5.partial");
  pid_t child = fork();
  assert_true(child >= 0);
  if (child == 0) {
    ew_error error = {0};
    sample made;
    bool good = create(&made, path.path, &error) == EW_OK;
    for (int64_t record = 0; good && record < 1000; record++) {
      good = push(&made, record, &error) == EW_OK && ew_hdf_seal(made.file, &error) == EW_OK;
      if (record % 100 == 49)
        good = good && ew_hdf_commit(made.file, &error) == EW_OK;
    }
    kill(getpid(), good ? SIGKILL : SIGTERM);
  }
  assert_int_equal(status_of(child), 128 + SIGKILL);
  assert_int_equal(assert_records_in(partial, 0), 950);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(test_a_full_disk_leaves_whole_records),
      cmocka_unit_test(test_a_kill_leaves_what_was_committed),
      cmocka_unit_test(test_rows_come_back_with_unit_meaning_and_attributes),
      cmocka_unit_test(test_rows_that_are_not_sealed_are_not_written),
      cmocka_unit_test(test_a_file_that_never_began_leaves_nothing),
      cmocka_unit_test(test_the_file_is_locked_while_it_is_written),
      cmocka_unit_test(test_the_caller_keeps_its_hdf5_error_report),
  };
  return cmocka_run_group_tests(tests, make_folder, remove_folder);
}
