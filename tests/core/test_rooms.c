/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The include rule of the rooms, read from the sources themselves: a room knows only those it builds on. Also what
 * every source owes its reader: a licence line, and no tabs. */
#include <dirent.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>

#include <cmocka.h>

/* The rooms that each room may include, itself among them. */
static const struct {
  const char *name;
  const char *may_use; /* each name between blanks */
} rooms[] = {
    {"core", " core "},
    {"cosmology", " core cosmology "},
    {"halo", " core cosmology halo "},
    {"tree", " core cosmology halo tree "},
    {"stars", " core stars "},
    {"galaxy", " core cosmology halo stars galaxy "},
    {"population", " core cosmology halo stars galaxy tree population "},
    {"catalogue", " core cosmology halo stars galaxy tree population catalogue "},
    {"inference", " core cosmology halo stars galaxy tree population catalogue inference "},
    {"report", " core cosmology halo stars galaxy tree population catalogue inference report "},
    {"cli", " core cosmology halo stars galaxy tree population catalogue inference report cli elfinwood "},
    {"elfinwood", " core cosmology halo stars galaxy tree population catalogue inference report "} /* the umbrella */
};

enum { PATH_SIZE = 512, LINE_SIZE = 4096 };

typedef struct {
  size_t files, includes, faults;
} counts;

typedef void visitor(const char *path, FILE *file, counts *tally);

static void fault(counts *tally, const char *path, const char *what, const char *detail) {
  print_error("%s: %s %s\n", path, what, detail);
  tally->faults++;
}

static bool ends_with(const char *text, const char *end) {
  size_t length = strlen(text), wanted = strlen(end);
  return length >= wanted && strcmp(text + length - wanted, end) == 0;
}

static bool is_c(const char *path) {
  return ends_with(path, ".c") || ends_with(path, ".h");
}

static void visit_tree(const char *path, visitor *visit, counts *tally) {
  DIR *folder = opendir(path);
  if (!folder) {
    FILE *file = fopen(path, "r");
    assert_non_null(file);
    visit(path, file, tally);
    fclose(file);
    tally->files++;
    return;
  }
  for (struct dirent *entry = readdir(folder); entry; entry = readdir(folder)) {
    char inner[PATH_SIZE];
    if (entry->d_name[0] == '.')
      continue;
    assert_in_range(snprintf(inner, sizeof inner, "%s/%s", path, entry->d_name), 1, PATH_SIZE - 1);
    visit_tree(inner, visit, tally);
  }
  closedir(folder);
}

/* -------------------------------------------------------------------------------------------------- include rule */

static const char *may_use(const char *room) {
  for (size_t i = 0; i < sizeof rooms / sizeof *rooms; i++)
    if (strcmp(rooms[i].name, room) == 0)
      return rooms[i].may_use;
  return NULL;
}

/* Copies `text` up to the first of `ends` there. */
static void copy_up_to(char *to, size_t size, const char *text, const char *ends) {
  snprintf(to, size, "%.*s", (int)strcspn(text, ends), text);
}

/* src/ROOM/... or include/elfinwood/ROOM.h */
static void room_of_file(const char *path, char room[64]) {
  const char *below = path + strlen(EW_SOURCE_FOLDER) + 1;
  const char *public_header = strstr(below, "include/elfinwood/");
  copy_up_to(room, 64, public_header ? public_header + strlen("include/elfinwood/") : below + strlen("src/"), "/.");
}

/* The room of #include "elfinwood/ROOM.h" and #include "ROOM/..."; false for system headers and those beside the
 * file. */
static bool room_of_include(const char *line, char room[64]) {
  char name[256];
  if (sscanf(line, " # include \"%255[^\"]\"", name) != 1 || !strchr(name, '/'))
    return false;
  const char *start = strncmp(name, "elfinwood/", 10) == 0 ? name + 10 : name;
  copy_up_to(room, 64, start, "/.");
  return true;
}

static bool is_allowed(const char *room, const char *included) {
  char wanted[80];
  snprintf(wanted, sizeof wanted, " %s ", included);
  return may_use(room) && strstr(may_use(room), wanted);
}

static void check_includes(const char *path, FILE *file, counts *tally) {
  char room[64], included[64], line[LINE_SIZE];
  room_of_file(path, room);
  if (!may_use(room))
    fault(tally, path, "is in no room:", room);
  while (is_c(path) && fgets(line, sizeof line, file)) {
    if (!room_of_include(line, included))
      continue;
    tally->includes++;
    if (!is_allowed(room, included))
      fault(tally, path, "must not know", included);
  }
}

static void test_a_room_knows_only_what_it_builds_on(void **state) {
  (void)state;
  counts tally = {0};
  visit_tree(EW_SOURCE_FOLDER "/src", check_includes, &tally);
  visit_tree(EW_SOURCE_FOLDER "/include/elfinwood", check_includes, &tally);
  assert_true(tally.files > 10 && tally.includes > tally.files / 2);
  assert_int_equal(tally.faults, 0);
}

static void test_the_rule_itself(void **state) {
  (void)state;
  char room[64];
  assert_true(room_of_include("#include \"elfinwood/halo.h\"\n", room));
  assert_string_equal(room, "halo");
  assert_true(room_of_include("  #  include \"galaxy/state.h\"", room));
  assert_string_equal(room, "galaxy");
  assert_false(room_of_include("#include <gsl/gsl_cdf.h>", room));
  assert_false(room_of_include("#include \"state.h\"", room));
  assert_true(is_allowed("halo", "cosmology"));
  assert_false(is_allowed("cosmology", "halo"));
  assert_false(is_allowed("galaxy", "tree"));
  assert_false(is_allowed("stars", "cosmology"));
  assert_false(is_allowed("core", "elfinwood"));
  assert_false(is_allowed("nowhere", "core"));
  room_of_file(EW_SOURCE_FOLDER "/src/stars/tables/a.c", room);
  assert_string_equal(room, "stars");
  room_of_file(EW_SOURCE_FOLDER "/include/elfinwood/tree.h", room);
  assert_string_equal(room, "tree");
}

/* ------------------------------------------------------------------------------------------------------- manners */

static void check_manners(const char *path, FILE *file, counts *tally) {
  static const char licence[] = "/* SPDX-License-Identifier: GPL-3.0-or-later";
  char line[LINE_SIZE];
  for (size_t number = 1; fgets(line, sizeof line, file); number++) {
    if (number == 1 && is_c(path) && strncmp(line, licence, sizeof licence - 1) != 0)
      fault(tally, path, "does not start with", licence);
    if (strchr(line, '\t'))
      fault(tally, path, "has a tab:", line);
  }
}

static void test_sources_have_a_licence_and_no_tabs(void **state) {
  (void)state;
  counts tally = {0};
  visit_tree(EW_SOURCE_FOLDER "/src", check_manners, &tally);
  visit_tree(EW_SOURCE_FOLDER "/include", check_manners, &tally);
  visit_tree(EW_SOURCE_FOLDER "/tests", check_manners, &tally);
  assert_true(tally.files > 10);
  assert_int_equal(tally.faults, 0);
}

int main(void) {
  const struct CMUnitTest tests[] = {cmocka_unit_test(test_the_rule_itself),
                                     cmocka_unit_test(test_a_room_knows_only_what_it_builds_on),
                                     cmocka_unit_test(test_sources_have_a_licence_and_no_tabs)};
  return cmocka_run_group_tests(tests, NULL, NULL);
}
