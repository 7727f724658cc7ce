/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Output files: what may be written, what is refused before it is touched, and the rename. */
#include "core/output.h"
#include "look.h"

#include <fcntl.h>
#include <sys/file.h>

typedef struct {
  look_path folder;
} place;

static int set_up(void **state) {
  static place here;
  here.folder = look_make_folder();
  *state = &here;
  return 0;
}

static int tear_down(void **state) {
  look_remove_folder(((place *)*state)->folder);
  return 0;
}

static void assert_refused(look_path path, const char *reason) {
  ew_error error = {0};
  assert_int_equal(ew_output_probe(path.path, &error), EW_FAILED);
  if (!strstr(error.message, reason) || strncmp(error.message, "cannot write ", 13) != 0)
    fail_msg("expected \"%s\" in \"%s\"", reason, error.message);
}

static void test_a_new_file_may_be_written_and_nothing_is_left_behind(void **state) {
  look_path path = look_join(((place *)*state)->folder, "a.h5");
  ew_error error = {0};
  assert_int_equal(ew_output_probe(path.path, &error), EW_OK);
  assert_false(look_exists(path));
  assert_false(look_exists(look_join(((place *)*state)->folder, "a.h5.partial")));
}

static void test_what_cannot_be_written_is_refused_with_path_and_reason(void **state) {
  look_path folder = ((place *)*state)->folder;
  look_write_text(look_join(folder, "file"), "text");
  assert_refused(look_join(folder, "missing/a.h5"), "missing/a.h5.partial: No such file or directory");
  assert_refused(look_join(folder, "file/a.h5"), "file/a.h5: Not a directory");
  assert_refused(look_join(folder, ""), "it is no file name");
  assert_refused(folder, "it is a folder");
  assert_refused((look_path){""}, "it is no file name");
  assert_refused((look_path){"/dev/full"}, "it is not a regular file");
  assert_refused((look_path){"/dev/null"}, "it is not a regular file");
}

static void test_a_long_name_keeps_its_reason(void **state) {
  look_path path = look_join(((place *)*state)->folder, "");
  size_t length = strlen(path.path);
  memset(path.path + length, 'n', 3000);
  path.path[length + 3000] = '\0';
  assert_refused(path, "File name too long");
}

static void test_links_and_protected_files_are_refused(void **state) {
  look_path folder = ((place *)*state)->folder, link = look_join(folder, "link.h5"),
            kept = look_join(folder, "kept.h5");
  look_write_text(kept, "text");
  assert_int_equal(symlink(kept.path, link.path), 0);
  assert_refused(link, "symbolic link");
  assert_int_equal(chmod(kept.path, 0444), 0);
  if (geteuid() != 0)
    assert_refused(kept, "Permission denied");
  char *text = look_read_text(kept);
  assert_string_equal(text, "text");
  free(text);
}

static void test_a_folder_without_permission_is_refused(void **state) {
  look_path folder = look_join(((place *)*state)->folder, "locked");
  assert_int_equal(mkdir(folder.path, 0555), 0);
  if (geteuid() != 0)
    assert_refused(look_join(folder, "a.h5"), "Permission denied");
}

static void test_a_partial_file_that_is_being_written_is_refused(void **state) {
  look_path folder = ((place *)*state)->folder, partial = look_join(folder, "a.h5.partial");
  look_write_text(partial, "half");
  int descriptor = open(partial.path, O_RDWR);
  assert_true(descriptor >= 0);
  assert_int_equal(flock(descriptor, LOCK_EX | LOCK_NB), 0);
  assert_refused(look_join(folder, "a.h5"), "a.h5.partial: another program is writing it");
  close(descriptor);
  char *text = look_read_text(partial);
  assert_string_equal(text, "half");
  free(text);
}

static void test_a_stale_partial_file_goes_and_a_whole_one_replaces(void **state) {
  look_path folder = ((place *)*state)->folder, path = look_join(folder, "a.h5");
  look_path partial = look_join(folder, "a.h5.partial");
  look_write_text(path, "old");
  look_write_text(partial, "stale");
  ew_error error = {0};
  ew_output output;
  assert_int_equal(ew_output_probe(path.path, &error), EW_OK);
  assert_true(look_exists(partial));
  assert_int_equal(ew_output_open(&output, path.path, &error), EW_OK);
  assert_false(look_exists(partial));
  look_write_text(partial, "new");
  char *before = look_read_text(path);
  assert_string_equal(before, "old");
  assert_int_equal(ew_output_publish(&output, &error), EW_OK);
  char *after = look_read_text(path);
  assert_string_equal(after, "new");
  assert_false(look_exists(partial));
  ew_output_clear(&output);
  free(before);
  free(after);
}

static void test_a_rename_that_fails_keeps_the_partial_file(void **state) {
  look_path folder = ((place *)*state)->folder, path = look_join(folder, "a.h5");
  ew_error error = {0};
  ew_output output;
  assert_int_equal(ew_output_open(&output, path.path, &error), EW_OK);
  look_write_text(look_join(folder, "a.h5.partial"), "new");
  assert_int_equal(mkdir(path.path, 0777), 0);
  assert_int_equal(ew_output_publish(&output, &error), EW_FAILED);
  assert_non_null(strstr(error.message, "cannot rename"));
  assert_true(look_exists(look_join(folder, "a.h5.partial")));
  ew_output_clear(&output);
}

int main(void) {
#define TEST(name) cmocka_unit_test_setup_teardown(name, set_up, tear_down)
  const struct CMUnitTest tests[] = {
      TEST(test_a_new_file_may_be_written_and_nothing_is_left_behind),
      TEST(test_what_cannot_be_written_is_refused_with_path_and_reason),
      TEST(test_a_long_name_keeps_its_reason),
      TEST(test_links_and_protected_files_are_refused),
      TEST(test_a_folder_without_permission_is_refused),
      TEST(test_a_partial_file_that_is_being_written_is_refused),
      TEST(test_a_stale_partial_file_goes_and_a_whole_one_replaces),
      TEST(test_a_rename_that_fails_keeps_the_partial_file),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
