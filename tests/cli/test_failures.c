/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * When the job cannot be finished: exit status 1, one line that says what was kept, whole trees in FILE.partial, and
 * what stood on the disk before unharmed. */
#include "program.h"

#define FOLDER_FILE "small.cfg"
#define FOLDER_TEXT PROGRAM_SMALL
#include "folder.h"

static void test_an_output_that_cannot_be_written_is_told_at_once(void **state) {
  (void)state;
  static const struct {
    const char *line, *part;
  } wrong[] = {
      {"run small.cfg -o missing/a.h5", "cannot write missing/a.h5.partial: No such file or directory"},
      {"run small.cfg -o small.cfg/a.h5", "Not a directory"},
      {"run small.cfg -o .", "cannot write .: it is a folder"},
      {"run small.cfg -o /dev/full", "cannot write /dev/full: it is not a regular file"},
      {"run small.cfg -o /dev/null", "it is not a regular file"},
      {"trees small.cfg -o missing/a.h5", "missing/a.h5"},
      {"spectrum small.cfg -o missing/a.h5", "missing/a.h5"},
      {"check small.cfg -o missing/a.h5", "missing/a.h5"},
  };
  for (size_t i = 0; i < sizeof wrong / sizeof wrong[0]; i++)
    program_assert_fails(folder, wrong[i].line, 1, wrong[i].part);
}

/* A request that is wrong is told before an output that cannot be written. */
static void test_requests_come_before_outputs(void **state) {
  (void)state;
  program_assert_fails(folder, "run small.cfg -o missing/a.h5 --set roots.count=0", 2, "roots.count");
}

static void test_results_that_cannot_be_printed_are_a_failure(void **state) {
  (void)state;
  static const char *const lines[] = {"parameters", "run small.cfg", "check small.cfg", "trees small.cfg",
                                      "spectrum small.cfg"};
  for (size_t i = 0; i < sizeof lines / sizeof lines[0]; i++) {
    const program_place full = {.folder = folder, .standard_output = "/dev/full"};
    program_result result = program_run_at(&full, lines[i]);
    program_assert_complaint(&result, 1, "cannot write to standard output: No space left on device");
    program_forget(result);
    const program_place closed = {.folder = folder, .standard_output = ""};
    result = program_run_at(&closed, lines[i]);
    program_assert_complaint(&result, 1, "cannot write to standard output: ");
    program_forget(result);
  }
  /* The files are whole all the same, and nothing that was printed went into them. */
  hid_t file = look_open(look_join(folder, "small.h5"));
  assert_int_equal(look_count(file, "/trees/tree"), 6);
  H5Fclose(file);
  const program_place closed = {.folder = folder, .standard_output = ""};
  program_result result = program_run_at(&closed, "run small.cfg --quiet");
  assert_int_equal(result.status, 0);
  program_forget(result);
}

/* Rows of 300 bytes: the limit falls in the middle of the job. */
static void test_a_full_disk_keeps_whole_trees(void **state) {
  (void)state;
  static const char line[] = "run small.cfg -o full.h5 --set roots.mass_range=[2e6,3e6] --set roots.count=3000";
  look_path whole = look_join(folder, "full.h5"), partial = look_join(folder, "full.h5.partial");
  program_run(folder, "run small.cfg -o full.h5");
  char *before = look_read_text(whole);
  const program_place tight = {.folder = folder, .largest_file = 900000};
  program_result result = program_run_at(&tight, line);
  program_assert_complaint(&result, 1, "cannot write full.h5.partial: File too large; ");
  assert_non_null(strstr(result.err, " of 3000 trees kept in full.h5.partial\n"));
  hid_t file = look_open(partial);
  assert_int_equal(look_integer_attribute(file, "complete"), 0);
  size_t trees = look_count(file, "/trees/tree"), rows = look_count(file, "/galaxies/tree");
  H5Fclose(file);
  assert_true(trees > 0 && trees < 3000);
  assert_int_equal(rows, 2 * trees);
  assert_int_equal(atoi(strstr(result.err, "; ") + 2), trees);
  program_forget(result);
  char *after = look_read_text(whole);
  assert_string_equal(before, after);
  free(before);
  free(after);
  look_path kept = look_join(folder, "kept.h5");
  assert_int_equal(rename(partial.path, kept.path), 0);
  program_run(folder, line);
  assert_true(look_assert_prefix(kept, whole) > 0);
}

static void test_a_disk_too_full_for_a_header_leaves_nothing(void **state) {
  (void)state;
  const program_place none = {.folder = folder, .largest_file = 4096};
  static const char *const commands[] = {"run", "trees", "spectrum"};
  for (size_t i = 0; i < sizeof commands / sizeof commands[0]; i++) {
    char line[64];
    snprintf(line, sizeof line, "%s small.cfg -o none.h5", commands[i]);
    program_result result = program_run_at(&none, line);
    program_assert_complaint(&result, 1, "cannot write none.h5.partial: File too large");
    program_forget(result);
    assert_false(look_exists(look_join(folder, "none.h5")));
    assert_false(look_exists(look_join(folder, "none.h5.partial")));
  }
}

static void test_a_stale_partial_file_is_replaced(void **state) {
  (void)state;
  look_write_text(look_join(folder, "stale.h5.partial"), "left by an earlier run");
  program_assert_fails(folder, "run small.cfg -o stale.h5 --set roots.count=0", 2, "roots.count");
  assert_true(look_exists(look_join(folder, "stale.h5.partial")));
  program_run(folder, "run small.cfg -o stale.h5");
  assert_false(look_exists(look_join(folder, "stale.h5.partial")));
  look_write_text(look_join(folder, "stale.h5"), "no catalogue at all");
  program_run(folder, "run small.cfg -o stale.h5");
  program_run(folder, "run small.cfg -o fresh.h5");
  look_assert_equal(look_join(folder, "stale.h5"), look_join(folder, "fresh.h5"));
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(test_an_output_that_cannot_be_written_is_told_at_once),
      cmocka_unit_test(test_requests_come_before_outputs),
      cmocka_unit_test(test_results_that_cannot_be_printed_are_a_failure),
      cmocka_unit_test(test_a_full_disk_keeps_whole_trees),
      cmocka_unit_test(test_a_disk_too_full_for_a_header_leaves_nothing),
      cmocka_unit_test(test_a_stale_partial_file_is_replaced),
  };
  return cmocka_run_group_tests(tests, make_folder, remove_folder);
}
