/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Interrupted jobs: what is done is kept, as a prefix of what the whole job would have written, bit for bit. */
#include "program.h"

/* More trees than can be grown while a test waits. */
#define LONG_RUN   "run small.cfg -o out.h5 --threads 2 --set roots.count=1000000"
#define LONG_TREES "trees small.cfg -o out.h5 --threads 2 --set roots.count=100000000"

static const double head_start = 0.6; /* s, for some trees to be done */

static int make_folder(void **state) {
  static look_path folder;
  folder = look_make_folder();
  look_write_text(look_join(folder, "small.cfg"), PROGRAM_SMALL);
  *state = &folder;
  return 0;
}

static int remove_folder(void **state) {
  look_remove_folder(*(look_path *)*state);
  return 0;
}

/* Outputs are opened right before the work begins. */
static void wait_for_output(look_path folder) {
  for (int i = 0; i < 2000 && !look_exists(look_join(folder, "out.h5.partial")); i++)
    program_sleep(0.01);
  assert_true(look_exists(look_join(folder, "out.h5.partial")));
}

/* Starts the job, stops it by the signal after a while; how many trees it says that it kept. */
static long interrupt(look_path folder, const char *line, int signal_number) {
  const program_place place = {.folder = folder};
  pid_t child = program_start(&place, line);
  wait_for_output(folder);
  program_sleep(head_start);
  assert_int_equal(kill(child, signal_number), 0);
  program_result result = program_wait(&place, child);
  program_assert_complaint(&result, 1, " trees; kept in out.h5.partial\n");
  long kept = 0;
  assert_int_equal(sscanf(result.err, "elfinwood: interrupted after %ld of ", &kept), 1);
  assert_string_equal(result.out, "");
  program_forget(result);
  return kept;
}

static void assert_partial(look_path folder, const char *trees, long kept) {
  hid_t file = look_open(look_join(folder, "out.h5.partial"));
  assert_int_equal(look_integer_attribute(file, "complete"), 0);
  assert_int_equal(look_count(file, trees), kept);
  H5Fclose(file);
}

static void check_interruption(look_path folder, const char *line, const char *trees, int signal_number) {
  look_write_text(look_join(folder, "out.h5"), "an older file");
  long kept = interrupt(folder, line, signal_number);
  assert_true(kept > 0);
  assert_partial(folder, trees, kept);
  char *text = look_read_text(look_join(folder, "out.h5"));
  assert_string_equal(text, "an older file");
  free(text);
  char again[128];
  snprintf(again, sizeof again, "%.*s small.cfg -o whole.h5 --set roots.count=%ld", (int)strcspn(line, " "), line,
           kept + 1);
  program_run(folder, again);
  assert_true(look_assert_prefix(look_join(folder, "out.h5.partial"), look_join(folder, "whole.h5")) > 0);
}

static void test_an_interrupted_run_keeps_a_prefix(void **state) {
  check_interruption(*(look_path *)*state, LONG_RUN, "/trees/tree", SIGINT);
}

static void test_a_terminated_run_keeps_a_prefix(void **state) {
  check_interruption(*(look_path *)*state, LONG_RUN, "/trees/tree", SIGTERM);
}

static void test_interrupted_trees_keep_a_prefix(void **state) {
  check_interruption(*(look_path *)*state, LONG_TREES, "/trees/number", SIGINT);
}

/* The output of a run that goes on is not taken away by a second one. */
static void test_two_runs_do_not_share_an_output(void **state) {
  look_path folder = *(look_path *)*state;
  const program_place place = {.folder = folder};
  pid_t child = program_start(&place, LONG_RUN);
  wait_for_output(folder);
  program_sleep(head_start);
  look_path elsewhere = look_join(folder, "elsewhere");
  assert_int_equal(mkdir(elsewhere.path, 0777), 0);
  program_assert_fails(elsewhere, "run ../small.cfg -o ../out.h5", 1, "another program is writing it");
  assert_int_equal(kill(child, SIGINT), 0);
  program_result result = program_wait(&place, child);
  program_assert_complaint(&result, 1, "interrupted after ");
  program_forget(result);
  H5Fclose(look_open(look_join(folder, "out.h5.partial")));
}

/* Branches of one huge tree keep the program busy far longer than this test waits. */
static void test_a_second_signal_kills(void **state) {
  look_path folder = *(look_path *)*state;
  const program_place place = {.folder = folder};
  pid_t child = program_start(&place, "run small.cfg -o out.h5 --threads 1 --set roots.kind=single --set "
                                      "roots.mass=1e13 --set trees.resolution_mass=1e6 --set roots.count=2");
  wait_for_output(folder);
  program_sleep(head_start);
  assert_int_equal(kill(child, SIGINT), 0);
  program_sleep(head_start);
  assert_int_equal(kill(child, SIGINT), 0);
  program_result result = program_wait(&place, child);
  assert_int_equal(result.status, 128 + SIGINT);
  program_forget(result);
  hid_t file = look_open(look_join(folder, "out.h5.partial"));
  assert_int_equal(look_integer_attribute(file, "complete"), 0);
  H5Fclose(file);
}

int main(void) {
#define TEST(name) cmocka_unit_test_setup_teardown(name, make_folder, remove_folder)
  const struct CMUnitTest tests[] = {
      TEST(test_an_interrupted_run_keeps_a_prefix),
      TEST(test_a_terminated_run_keeps_a_prefix),
      TEST(test_interrupted_trees_keep_a_prefix),
      TEST(test_two_runs_do_not_share_an_output),
      TEST(test_a_second_signal_kills),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
