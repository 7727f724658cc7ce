/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The parameter engine, on a table with every type: what is read, what is refused and in which words, what is written
 * back. Messages are compared whole, since they are what a user has to go by. */
#include "elfinwood/core.h"

#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include <cmocka.h>

typedef struct {
  double hubble;
  int64_t seed;
} first_part;

typedef struct {
  bool follow;
  int kind;
  char file[EW_TEXT_SIZE];
  double mass_range[2];
  double mass;
  int64_t count;
} second_part;

typedef struct {
  int unrelated;
  first_part first;
  second_part second;
} target;

static const ew_choice kinds[] = {{"single", "One halo.", "own choice"},
                                  {"range", "A range of masses.", "common practice"},
                                  {"list", "Masses from a file.", "own choice"},
                                  {NULL, NULL, NULL}};

static const ew_parameter first_rows[] = {{"cosmology.hubble", EW_REAL, offsetof(first_part, hubble), "1", "0.6736",
                                           0.2, 1.5, NULL, "The Hubble constant in units of 100 km/s/Mpc.",
                                           "Planck 2018 VI"},
                                          {"random.seed", EW_INTEGER, offsetof(first_part, seed), "1", "1", -HUGE_VAL,
                                           HUGE_VAL, NULL, "The seed.", "own choice"},
                                          {.name = NULL}};

static const ew_parameter second_rows[] = {
    {"trees.follow", EW_FLAG, offsetof(second_part, follow), "", "true", 0, 0, NULL, "Whether to follow.",
     "own choice"},
    {"roots.kind", EW_CHOICE, offsetof(second_part, kind), "", "\"range\"", 0, 0, kinds, "How masses are chosen.",
     "own choice"},
    {"trees.file", EW_TEXT, offsetof(second_part, file), "", "\"\"", 0, 0, NULL, "The tree file.", "own choice"},
    {"roots.mass_range", EW_INTERVAL, offsetof(second_part, mass_range), "Msun", "[1e8, 3e10]", 1e6, 1e16, NULL,
     "Masses of the roots.", "own choice"},
    {"roots.mass", EW_REAL, offsetof(second_part, mass), "Msun", "1e10", 0, HUGE_VAL, NULL, "Mass of the root.",
     "own choice"},
    {"roots.count", EW_INTEGER, offsetof(second_part, count), "1", "10", 1, 1e12, NULL, "Number of trees.",
     "own choice"},
    {.name = NULL}};

static const ew_parameter_group groups[] = {{first_rows, offsetof(target, first)},
                                            {second_rows, offsetof(target, second)}};

static const ew_parameter_table table = {groups, 2};

typedef struct {
  target target;
  ew_parameter_values values;
  ew_error error;
  char folder[64];
} fixture;

static int open_table(void **state) {
  fixture *f = calloc(1, sizeof *f);
  if (!f)
    return 1;
  *state = f;
  strcpy(f->folder, "/tmp/elfinwood-XXXXXX");
  return !mkdtemp(f->folder) || ew_parameters_open(&f->values, &table, &f->target, &f->error) != EW_OK;
}

static int close_table(void **state) {
  fixture *f = *state;
  ew_parameters_close(&f->values);
  ew_parameters_close(&f->values); /* twice does no harm */
  rmdir(f->folder);
  free(f);
  return 0;
}

static const char *origin(const fixture *f, const char *name) {
  size_t index = 0;
  assert_non_null(ew_parameters_find(&table, name, &index));
  return f->values.origin[index].text;
}

/* A file in the folder of the test; removed by the caller. */
static void write_file(const fixture *f, const char *name, const char *text, size_t size, char path[128]) {
  snprintf(path, 128, "%s/%s", f->folder, name);
  FILE *out = fopen(path, "w");
  assert_non_null(out);
  assert_int_equal(fwrite(text, 1, size, out), size);
  fclose(out);
}

static void accept_text(fixture *f, const char *text) {
  f->error = (ew_error){0};
  ew_status status = ew_parameters_read_text(&f->values, text, "f.cfg", &f->error);
  assert_string_equal(f->error.message, "");
  assert_int_equal(status, EW_OK);
}

static void accept_assignment(fixture *f, const char *assignment) {
  f->error = (ew_error){0};
  ew_status status = ew_parameters_assign(&f->values, assignment, "--set", &f->error);
  assert_string_equal(f->error.message, "");
  assert_int_equal(status, EW_OK);
}

/* ---------------------------------------------------------------------------------------------- what is accepted */

static void test_rows_are_counted_through_all_groups(void **state) {
  (void)state;
  assert_int_equal(ew_parameters_count(&table), 8);
  assert_string_equal(ew_parameters_row(&table, 1)->name, "random.seed");
  assert_string_equal(ew_parameters_row(&table, 2)->name, "trees.follow");
  size_t index = 99;
  assert_ptr_equal(ew_parameters_find(&table, "roots.mass", &index), &second_rows[4]);
  assert_int_equal(index, 6);
  assert_ptr_equal(ew_parameters_find(&table, "roots.mass", NULL), &second_rows[4]);
  assert_null(ew_parameters_find(&table, "roots.mas", &index));
  assert_null(ew_parameters_find(&table, "roots", &index));
}

static void test_defaults_are_set(void **state) {
  const fixture *f = *state;
  assert_true(f->target.first.hubble == 0.6736);
  assert_int_equal(f->target.first.seed, 1);
  assert_true(f->target.second.follow);
  assert_int_equal(f->target.second.kind, 1);
  assert_string_equal(f->target.second.file, "");
  assert_true(f->target.second.mass_range[0] == 1e8 && f->target.second.mass_range[1] == 3e10);
  assert_int_equal(f->target.unrelated, 0);
  for (size_t i = 0; i < ew_parameters_count(&table); i++)
    assert_string_equal(f->values.origin[i].text, "default");
}

static void test_every_type_is_read_with_its_origin(void **state) {
  fixture *f = *state;
  accept_text(f, "# a comment\n"
                 "cosmology : { hubble = 1; };\n"
                 "random = { seed = 5000000000 }\n"
                 "roots : {\n"
                 "  kind = \"list\";\n"
                 "  mass_range = [2000000, 30000000000]; // whole numbers, of which one needs 64 bits\n"
                 "  mass = 12345678901234567890; /* beyond\n 64 bits */\n"
                 "  count\n  = 5L, };\n"
                 "trees : { follow = FALSE; file = \"a \" \"b;{\\n\\x41\"; };\n");
  assert_true(f->target.first.hubble == 1.0);
  assert_true(f->target.first.seed == 5000000000);
  assert_false(f->target.second.follow);
  assert_int_equal(f->target.second.kind, 2);
  assert_string_equal(f->target.second.file, "a b;{\nA");
  assert_true(f->target.second.mass_range[0] == 2e6 && f->target.second.mass_range[1] == 3e10);
  assert_true(f->target.second.mass == 12345678901234567890.0);
  assert_true(f->target.second.count == 5);
  assert_string_equal(origin(f, "cosmology.hubble"), "f.cfg:2");
  assert_string_equal(origin(f, "random.seed"), "f.cfg:3");
  assert_string_equal(origin(f, "roots.mass_range"), "f.cfg:6");
  assert_string_equal(origin(f, "roots.count"), "f.cfg:9");
  assert_string_equal(origin(f, "trees.file"), "f.cfg:11");
}

static void test_other_spellings_are_read(void **state) {
  fixture *f = *state;
  accept_text(f, "");
  accept_text(f, "roots : {};");
  accept_text(f, "roots : { mass_range = (1e7, 25000000); };");
  assert_true(f->target.second.mass_range[0] == 1e7 && f->target.second.mass_range[1] == 2.5e7);
  accept_text(f, "random : { seed = -9223372036854775808; };");
  assert_true(f->target.first.seed == INT64_MIN);
  accept_text(f, "cosmology : {\r\n  hubble = +.5e0;\r\n};\r\n# no newline at the end");
  assert_true(f->target.first.hubble == 0.5);
  accept_text(f, "cosmology:{hubble=0.2;};");
  accept_text(f, "cosmology:{hubble=1.5;};"); /* both ends are allowed */
}

static void test_later_reads_win(void **state) {
  fixture *f = *state;
  accept_text(f, "cosmology : { hubble = 0.5; };\nroots : { count = 3; };");
  accept_text(f, "cosmology : { hubble = 0.6; };");
  assert_true(f->target.first.hubble == 0.6);
  assert_int_equal(f->target.second.count, 3);
  accept_assignment(f, "cosmology.hubble=0.7");
  assert_true(f->target.first.hubble == 0.7);
  assert_string_equal(origin(f, "cosmology.hubble"), "--set");
  assert_string_equal(origin(f, "roots.count"), "f.cfg:2");
}

/* ----------------------------------------------------------------------------------------------- what is refused */

typedef struct {
  const char *given, *message;
} refusal;

#define HUBBLE      "; allowed: a number from 0.2 to 1.5"
#define SEED        "; allowed: a whole number"
#define COUNT       "; allowed: a whole number from 1 to 1e12"
#define FOLLOW      "; allowed: true or false"
#define KIND        "; allowed: \"single\", \"range\" or \"list\""
#define FILE_       "; allowed: text, at most 1023 bytes"
#define RANGE       "; allowed: [low, high] from 1e6 to 1e16 Msun"
#define MASS        "; allowed: a number of at least 0 Msun"
#define MIXED       "an array holds one type: all numbers whole, or all with a point as in [1.0, 2.5]"
#define NOT_INTEGER "wrong type, not an integer of up to 64 bits without point or exponent"

static const refusal in_files[] = {
    /* names */
    {"cosmology : {\n  huble = 0.7;\n};",
     "f.cfg:2: cosmology.huble = 0.7: no parameter of that name; did you mean cosmology.hubble?"},
    {"cosmolgy : {\n  hubble = 0.7;\n};",
     "f.cfg:2: cosmolgy.hubble = 0.7: no parameter of that name; did you mean cosmology.hubble?"},
    {"reionization : {\n\n  count = 7;\n};",
     "f.cfg:3: reionization.count = 7: no parameter of that name; did you mean roots.count?"},
    {"tres : {};", "f.cfg:1: tres: no group of that name; did you mean trees.follow?"},
    {"hubble = 0.7;", "f.cfg:1: hubble = 0.7: stands outside any group; did you mean cosmology.hubble?"},
    {"cosmology = 0.7;", "f.cfg:1: cosmology = 0.7: stands outside any group; did you mean cosmology.hubble?"},
    {"cosmology.hubble = 0.7;", "f.cfg:1: cosmology.hubble = 0.7: in a file a key stands inside its group, "
                                "\"group : { key = value; };\"" HUBBLE},
    {"cosmology : {\n hubble : { value = 0.7; };\n};",
     "f.cfg:2: cosmology.hubble = {: wrong type, this is a group" HUBBLE},
    {"cosmology : {\n\n mass = 7;\n};", /* a right key in a wrong group is nearer than a wrong key in a right one */
     "f.cfg:3: cosmology.mass = 7: no parameter of that name; did you mean roots.mass?"},
    /* twice */
    {"cosmology : {\n hubble = 0.7;\n # again\n hubble = 0.8;\n};",
     "f.cfg:4: cosmology.hubble = 0.8: set twice, first at f.cfg:2" HUBBLE},
    {"roots : { count = 1; mass = 1e9; count = 2; kind = \"list\"; };",
     "f.cfg:1: roots.count = 2: set twice, first at f.cfg:1" COUNT},
    {"cosmology : { hubble = 0.7; };\nroots : { count = 1; };\ncosmology : {};",
     "f.cfg:3: cosmology: opened twice, first at f.cfg:1; allowed: once, with all its keys inside"},
    /* types */
    {"cosmology : { hubble = \"many\"; };", "f.cfg:1: cosmology.hubble = \"many\": wrong type, this is text" HUBBLE},
    {"cosmology : { hubble = true; };", "f.cfg:1: cosmology.hubble = true: wrong type, this is true or false" HUBBLE},
    {"cosmology : { hubble = [0.7]; };", "f.cfg:1: cosmology.hubble = [0.7]: wrong type, this is an array" HUBBLE},
    {"cosmology : { hubble = (0.7); };", "f.cfg:1: cosmology.hubble = (0.7): wrong type, this is a list" HUBBLE},
    {"roots : { count = 2.0; };", "f.cfg:1: roots.count = 2.0: " NOT_INTEGER COUNT},
    {"roots : { count = 1e3; };", "f.cfg:1: roots.count = 1e3: " NOT_INTEGER COUNT},
    {"roots : { count = true; };", "f.cfg:1: roots.count = true: wrong type, this is true or false" COUNT},
    {"trees : { follow = 1; };", "f.cfg:1: trees.follow = 1: wrong type, this is a whole number" FOLLOW},
    {"trees : { file = 1.5; };",
     "f.cfg:1: trees.file = 1.5: wrong type, this is a number with a point or an exponent" FILE_},
    {"roots : { kind = 1; };", "f.cfg:1: roots.kind = 1: wrong type, this is a whole number" KIND},
    {"roots : { kind = range; };", "f.cfg:1: roots.kind = range: text needs double quotes" KIND},
    /* ranges */
    {"cosmology : {\n hubble = 7;\n};", "f.cfg:2: cosmology.hubble = 7: out of range" HUBBLE},
    {"cosmology : { hubble = 0.19999999999999998; };",
     "f.cfg:1: cosmology.hubble = 0.19999999999999998: out of range" HUBBLE},
    {"roots : { mass = -1; };", "f.cfg:1: roots.mass = -1: out of range" MASS},
    {"roots : { count = 0; };", "f.cfg:1: roots.count = 0: out of range" COUNT},
    {"roots : { kind = \"rang\"; };", "f.cfg:1: roots.kind = \"rang\": not one of the choices" KIND},
    {"roots : { kind = \"\"; };", "f.cfg:1: roots.kind = \"\": not one of the choices" KIND},
    /* not numbers */
    {"cosmology : {\n hubble = nan;\n};", "f.cfg:2: cosmology.hubble = nan: not a finite number" HUBBLE},
    {"roots : { mass = -Inf; };", "f.cfg:1: roots.mass = -Inf: not a finite number" MASS},
    {"roots : { mass = 1e999; };", "f.cfg:1: roots.mass = 1e999: too large for a number" MASS},
    {"roots : { mass_range = [1e7, 1e999]; };",
     "f.cfg:1: roots.mass_range = [1e7, 1e999]: too large for a number" RANGE},
    {"roots : { mass = 1d9; };", "f.cfg:1: roots.mass = 1d9: not a number" MASS},
    {"roots : { mass = .; };", "f.cfg:1: roots.mass = .: not a number" MASS},
    {"random : { seed = 0xffffffff; };",
     "f.cfg:1: random.seed = 0xffffffff: hexadecimal numbers are not accepted, write it in decimals" SEED},
    {"random : { seed = 9223372036854775808; };", "f.cfg:1: random.seed = 9223372036854775808: " NOT_INTEGER SEED},
    {"random : { seed = 9223372036854775808L; };",
     "f.cfg:1: random.seed = 9223372036854775808L: too large for a whole number" SEED},
    /* intervals */
    {"roots : { mass_range = [1, 2.5]; };", "f.cfg:1: roots.mass_range = [1, 2.5]: " MIXED RANGE},
    {"roots : { mass_range = [1e7,\n 20000000]; };", "f.cfg:2: roots.mass_range = [1e7,  20000000]: " MIXED RANGE},
    {"roots : { mass_range = [2e8, 1e8]; };",
     "f.cfg:1: roots.mass_range = [2e8, 1e8]: the first is above the second" RANGE},
    {"roots : { mass_range = [1e8, 1e17]; };", "f.cfg:1: roots.mass_range = [1e8, 1e17]: out of range" RANGE},
    {"roots : { mass_range = [1e8]; };", "f.cfg:1: roots.mass_range = [1e8]: two numbers are needed, not 1" RANGE},
    {"roots : { mass_range = []; };", "f.cfg:1: roots.mass_range = []: two numbers are needed, not 0" RANGE},
    {"roots : { mass_range = [1e8, 1e9, 1e10]; };",
     "f.cfg:1: roots.mass_range = [1e8, 1e9, 1e10]: two numbers are needed, not 3" RANGE},
    {"roots : { mass_range = 1e8; };",
     "f.cfg:1: roots.mass_range = 1e8: wrong type, this is a number with a point or an exponent" RANGE},
    {"roots : { mass_range = (\"a\", 1e9); };",
     "f.cfg:1: roots.mass_range = (\"a\", 1e9): wrong type, this is text" RANGE},
    {"roots : { mass_range = [\"a\", 1e9]; };", "f.cfg:1: roots.mass_range = [\"a\", 1e9]: " MIXED RANGE},
    {"roots : { mass_range = [1e9, true]; };", "f.cfg:1: roots.mass_range = [1e9, true]: " MIXED RANGE},
    /* text */
    {"trees : { file = \"a\\x00b\"; };", "f.cfg:1: trees.file = \"a\\x00b\": text cannot hold a NUL character" FILE_},
    {"trees : {\n file = \"abc;\n};\n", "f.cfg:2: trees.file = \"abc; }; : text is never closed" FILE_},
    {"trees : {\n file \"abc\";\n};",
     "f.cfg:2: text where none can stand (is a = or a quote missing): \"file \"abc\";\""},
    /* syntax */
    {"roots : { count = 2; };\ntrees\n\n", "f.cfg:2: syntax error in \"trees\""},
    {"cosmology : {\n  hubble 0.7;\n};", "f.cfg:2: syntax error in \"hubble 0.7;\""},
    {"cosmology : {\n  hubble = 0.7 0.8;\n};",
     "f.cfg:2: cosmology.hubble = 0.7 0.8: syntax error in \"hubble = 0.7 0.8;\"" HUBBLE},
    {"cosmology : {\n  hubble = ;\n};", "f.cfg:2: cosmology.hubble = : no value" HUBBLE},
    {"cosmology : {\n  hubble =\n};\nroots : {\n count =\n mass = 3; };",
     "f.cfg:6: roots.mass = 3: the setting before it has no value" MASS},
    {"roots : { count = 2; };\ncosmology : {\n  hubble = 0.7;\n", "f.cfg:2: cosmology: this group is never closed"},
    {"roots : { count = 2; };\n}\n", "f.cfg:2: syntax error in \"}\""},
    {"roots : { count = 2; }; /* never\nending\n",
     "f.cfg:1: comment is never closed: \"roots : { count = 2; }; /* never\""},
    {"roots : {\n count = 2; /* never };", "f.cfg:2: comment is never closed: \"count = 2; /* never };\""},
    {"roots : { count = 2; };\n@include roots.cfg\n", "f.cfg:2: syntax error in \"@include roots.cfg\""},
    {"roots : { count = 2; };\n  @include \"roots.cfg\"\n",
     "f.cfg:2: @include \"roots.cfg\": only a file can include another"}};

static void test_files_are_refused_in_one_line(void **state) {
  fixture *f = *state;
  for (size_t i = 0; i < sizeof in_files / sizeof *in_files; i++) {
    f->error = (ew_error){0};
    ew_status status = ew_parameters_read_text(&f->values, in_files[i].given, "f.cfg", &f->error);
    assert_string_equal(f->error.message, in_files[i].message);
    assert_int_equal(status, EW_REFUSED);
    assert_int_equal(f->error.status, EW_REFUSED);
  }
}

static void test_a_refusal_needs_no_error_to_fill(void **state) {
  fixture *f = *state;
  assert_int_equal(ew_parameters_read_text(&f->values, "a : { b = 1; };", "f.cfg", NULL), EW_REFUSED);
  assert_int_equal(ew_parameters_assign(&f->values, "a.b=1", "--set", NULL), EW_REFUSED);
}

static const refusal assignments[] = {
    {"cosmology.hubble", "--set: cosmology.hubble: no = in it; allowed: group.key=value"},
    {"", "--set: : no = in it; allowed: group.key=value"},
    {" = 3", "--set:  = 3: no name before the =; allowed: group.key=value"},
    {"cosmology.hubble= ", "--set: cosmology.hubble = : no value" HUBBLE},
    {"trees.file=", "--set: trees.file = : no value (\"\" is empty text)" FILE_},
    {"roots.mas=1e9", "--set: roots.mas = 1e9: no parameter of that name; did you mean roots.mass?"},
    {"mass=1e9", "--set: mass = 1e9: no parameter of that name; did you mean roots.mass?"},
    {"cosmology.hubble=many", "--set: cosmology.hubble = many: wrong type, this is text" HUBBLE},
    {"cosmology.hubble=7", "--set: cosmology.hubble = 7: out of range" HUBBLE},
    {"cosmology.hubble=nan", "--set: cosmology.hubble = nan: not a finite number" HUBBLE},
    {"cosmology.hubble=1e999", "--set: cosmology.hubble = 1e999: too large for a number" HUBBLE},
    {"cosmology.hubble=0x1",
     "--set: cosmology.hubble = 0x1: hexadecimal numbers are not accepted, write it in decimals" HUBBLE},
    {"cosmology.hubble=1; b=2", "--set: cosmology.hubble = 1; b=2: wrong type, this is text" HUBBLE},
    {"cosmology.hubble=0.7; roots", "--set: cosmology.hubble = 0.7; roots: wrong type, this is text" HUBBLE},
    {"cosmology.hubble=0.7); x=(1", "--set: cosmology.hubble = 0.7); x=(1: wrong type, this is text" HUBBLE},
    {"cosmology.hubble=0.7, 0.8", "--set: cosmology.hubble = 0.7, 0.8: wrong type, this is text" HUBBLE},
    {"cosmology.hubble=0.7 # 0.8", "--set: cosmology.hubble = 0.7 # 0.8: wrong type, this is text" HUBBLE},
    {"cosmology.hubble=0.7 /* 0.8", "--set: cosmology.hubble = 0.7 /* 0.8: wrong type, this is text" HUBBLE},
    {"cosmology.hubble==0.7", "--set: cosmology.hubble = =0.7: wrong type, this is text" HUBBLE},
    {"cosmology.hubble={}", "--set: cosmology.hubble = {}: wrong type, this is a group" HUBBLE},
    {"cosmology.hubble=", "--set: cosmology.hubble = : no value" HUBBLE},
    {"trees.follow=yes", "--set: trees.follow = yes: wrong type, this is text" FOLLOW},
    {"trees.follow=1", "--set: trees.follow = 1: wrong type, this is a whole number" FOLLOW},
    {"roots.kind=rang", "--set: roots.kind = rang: not one of the choices" KIND},
    {"roots.count=1.5", "--set: roots.count = 1.5: " NOT_INTEGER COUNT},
    {"roots.count=ten", "--set: roots.count = ten: wrong type, this is text" COUNT},
    {"roots.mass_range=[10000000, 2.5e7]", "--set: roots.mass_range = [10000000, 2.5e7]: " MIXED RANGE},
    {"roots.mass_range=1e7,2e7", "--set: roots.mass_range = 1e7,2e7: wrong type, this is text" RANGE},
    {"trees.file=12", "--set: trees.file = 12: wrong type, this is a whole number" FILE_}};

static void test_assignments_are_refused_in_one_line(void **state) {
  fixture *f = *state;
  for (size_t i = 0; i < sizeof assignments / sizeof *assignments; i++) {
    f->error = (ew_error){0};
    ew_status status = ew_parameters_assign(&f->values, assignments[i].given, "--set", &f->error);
    assert_string_equal(f->error.message, assignments[i].message);
    assert_int_equal(status, EW_REFUSED);
  }
  assert_true(f->target.first.hubble == 0.6736);
  assert_string_equal(origin(f, "cosmology.hubble"), "default");
}

static void test_assignments_are_read(void **state) {
  fixture *f = *state;
  accept_assignment(f, "cosmology.hubble=1");
  assert_true(f->target.first.hubble == 1.0);
  accept_assignment(f, "  cosmology.hubble =\t0.71 ");
  assert_true(f->target.first.hubble == 0.71);
  accept_assignment(f, "random.seed=9223372036854775807");
  assert_true(f->target.first.seed == INT64_MAX);
  accept_assignment(f, "trees.follow=false");
  assert_false(f->target.second.follow);
  accept_assignment(f, "roots.kind=list");
  assert_int_equal(f->target.second.kind, 2);
  accept_assignment(f, "roots.kind=\"single\"");
  assert_int_equal(f->target.second.kind, 0);
  accept_assignment(f, "roots.mass_range=[10000000, 20000000]");
  assert_true(f->target.second.mass_range[0] == 1e7 && f->target.second.mass_range[1] == 2e7);
  accept_assignment(f, "roots.mass_range=(10000000, 2.5e7)");
  assert_true(f->target.second.mass_range[1] == 2.5e7);
}

static void test_assigned_text_needs_no_quotes(void **state) {
  fixture *f = *state;
  static const char *const same[] = {"trees/a b.txt",     "1; b=2", ".",  "../x#1", "{", "-",
                                     "a\n@include \"x\"", "a=b",    "nan"};
  for (size_t i = 0; i < sizeof same / sizeof *same; i++) {
    char assignment[64];
    snprintf(assignment, sizeof assignment, "trees.file=%s", same[i]);
    accept_assignment(f, assignment);
    assert_string_equal(f->target.second.file, same[i]);
  }
  accept_assignment(f, "trees.file=\"12\"");
  assert_string_equal(f->target.second.file, "12");
  accept_assignment(f, "trees.file=\"\"");
  assert_string_equal(f->target.second.file, "");
}

static void test_text_is_bounded(void **state) {
  fixture *f = *state;
  char assignment[EW_TEXT_SIZE + 32] = "trees.file=";
  size_t start = strlen(assignment);
  memset(assignment + start, 'a', EW_TEXT_SIZE);
  assignment[start + EW_TEXT_SIZE] = '\0';
  assert_int_equal(ew_parameters_assign(&f->values, assignment, "--set", &f->error), EW_REFUSED);
  assert_non_null(strstr(f->error.message, "aaa...: too long, 1024 bytes" FILE_));
  assert_string_equal(f->target.second.file, "");
  assignment[start + EW_TEXT_SIZE - 1] = '\0';
  accept_assignment(f, assignment);
  assert_int_equal(strlen(f->target.second.file), EW_TEXT_SIZE - 1);
}

static bool is_one_plain_line(const char *text) {
  for (; *text; text++)
    if ((unsigned char)*text < 0x20 || *text == 0x7f)
      return false;
  return true;
}

static void test_messages_stay_short_and_plain(void **state) {
  fixture *f = *state;
  const size_t size = 100000;
  char *text = malloc(size + 1);
  assert_non_null(text);
  static const char *const fillers[] = {"a", "\xc3\xa9", "\x1b[31m", "\n", "(", "9", "\xc2\x9b"};
  static const char *const forms[] = {"%s", "cosmology.hubble = %s", "%s = 1", "cosmology : { hubble = \"%s\"; };",
                                      "cosmology : { %s = 1; };"};
  for (size_t i = 0; i < sizeof fillers / sizeof *fillers; i++)
    for (size_t j = 0; j < sizeof forms / sizeof *forms; j++) {
      char filling[4001] = "";
      for (size_t k = 0; k + strlen(fillers[i]) < sizeof filling; k += strlen(fillers[i]))
        strcat(filling + k, fillers[i]);
      const char *form = strstr(forms[j], "%s");
      snprintf(text, size, "%.*s%s%s", (int)(form - forms[j]), forms[j], filling, form + 2);
      for (int assigned = 0; assigned < 2; assigned++) {
        f->error = (ew_error){0};
        ew_status status = assigned ? ew_parameters_assign(&f->values, text, "--set", &f->error)
                                    : ew_parameters_read_text(&f->values, text, "f.cfg", &f->error);
        assert_true(status == EW_REFUSED || status == EW_OK);
        assert_true(is_one_plain_line(f->error.message));
        assert_null(strstr(f->error.message, "\xc2\x9b"));
        assert_true(strlen(f->error.message) < 600);
      }
    }
  free(text);
}

/* Damaged text is refused or read, but never more than that. */
static void test_damaged_text_does_no_harm(void **state) {
  fixture *f = *state;
  static const char whole[] = "cosmology : { hubble = 0.7; }; /* c */ roots = { mass_range = [1e8, 1e9]; # d\n"
                              "kind = \"list\", count = 12L }\ntrees : { file = \"a\\\"b\" \"c\"; follow = true; };\n";
  static const char alphabet[] = "{}[]()=:;,\"\\/*#@.-+eLx0 \n\tan";
  ew_stream stream = ew_stream_open(&(ew_draws){.seed = 7}, EW_PROCESS_ROOTS, 0, 0);
  size_t refused = 0;
  for (int i = 0; i < 5000; i++) {
    char text[sizeof whole];
    memcpy(text, whole, sizeof whole);
    for (int change = 0; change < 3; change++)
      text[ew_draw_word(&stream) % (sizeof whole - 1)] = alphabet[ew_draw_word(&stream) % (sizeof alphabet - 1)];
    text[ew_draw_word(&stream) % sizeof whole] = '\0';
    f->error = (ew_error){0};
    ew_status status = ew_parameters_read_text(&f->values, text, "f.cfg", &f->error);
    assert_true(status == EW_REFUSED || status == EW_OK);
    assert_true((status == EW_OK) == (strlen(f->error.message) == 0));
    assert_true(is_one_plain_line(f->error.message));
    refused += status == EW_REFUSED;
  }
  assert_true(refused > 4000 && refused < 5000);
  assert_true(f->target.first.hubble >= 0.2 && f->target.first.hubble <= 1.5);
  assert_non_null(memchr(f->target.second.file, '\0', EW_TEXT_SIZE));
}

/* --------------------------------------------------------------------------------------------------------- files */

static void expect_refusal(fixture *f, const char *path, const char *message) {
  f->error = (ew_error){0};
  assert_int_equal(ew_parameters_read(&f->values, path, &f->error), EW_REFUSED);
  assert_string_equal(f->error.message, message);
}

static void test_unreadable_files_are_refused(void **state) {
  fixture *f = *state;
  char path[128], message[256];
  expect_refusal(f, "/nowhere/at/all.cfg", "/nowhere/at/all.cfg: No such file or directory");
  snprintf(message, sizeof message, "%s: Is a directory", f->folder);
  expect_refusal(f, f->folder, message);
  expect_refusal(f, "/dev/zero", "/dev/zero: too large for a parameter file");
  write_file(f, "binary.cfg", "\x89HDF\0\0", 6, path);
  snprintf(message, sizeof message, "%s: not a text file", path);
  expect_refusal(f, path, message);
  unlink(path);
}

static void test_a_long_path_keeps_its_end(void **state) {
  fixture *f = *state;
  char path[3001];
  for (size_t i = 0; i < sizeof path - 1; i++)
    path[i] = i % 2 ? '/' : '.';
  strcpy(path + sizeof path - 9, "end.cfg");
  assert_int_equal(ew_parameters_read(&f->values, path, &f->error), EW_REFUSED);
  assert_int_equal(strncmp(f->error.message, "...", 3), 0);
  assert_non_null(strstr(f->error.message, "/end.cfg: "));
  assert_true(strlen(f->error.message) < 400);
}

#define WRITE(f, name, text, path) write_file(f, name, text, strlen(text), path)

/* Each file is looked for beside the one that names it, and a group may go on in the file that it includes. */
static void test_includes_are_spliced_in(void **state) {
  fixture *f = *state;
  char top[128], base[128], deep[128], deeper[128], folder[128], wanted[512];
  snprintf(folder, sizeof folder, "%s/sub", f->folder);
  assert_int_equal(mkdir(folder, 0700), 0);
  WRITE(
      f, "top.cfg",
      "\xef\xbb\xbf# @include \"nothing.cfg\"\n@include \"base.cfg\"\ncosmology : {\n\t@include \"sub/deep.cfg\"\n};\n"
      "trees : { file = \"\n@include \\\"x\\\"\"; };\nrandom : { seed = 3; };\n",
      top);
  WRITE(f, "base.cfg", "roots : {\n  count = 4;\n};", base);
  WRITE(f, "sub/deep.cfg", "\n@include \"deeper.cfg\"\n# end without newline", deep);
  WRITE(f, "sub/deeper.cfg", "hubble = 0.7;\n", deeper);
  ew_status status = ew_parameters_read(&f->values, top, &f->error);
  assert_string_equal(f->error.message, "");
  assert_int_equal(status, EW_OK);
  assert_true(f->target.first.hubble == 0.7);
  assert_int_equal(f->target.second.count, 4);
  assert_string_equal(f->target.second.file, "\n@include \"x\"");
  snprintf(wanted, sizeof wanted, "%s:2", base);
  assert_string_equal(origin(f, "roots.count"), wanted);
  snprintf(wanted, sizeof wanted, "%s:1", deeper);
  assert_string_equal(origin(f, "cosmology.hubble"), wanted);
  snprintf(wanted, sizeof wanted, "%s:8", top);
  assert_string_equal(origin(f, "random.seed"), wanted);

  WRITE(f, "sub/deeper.cfg", "hubble = 7;\n", deeper);
  snprintf(wanted, sizeof wanted, "%s:1: cosmology.hubble = 7: out of range" HUBBLE, deeper);
  expect_refusal(f, top, wanted);
  WRITE(f, "sub/deeper.cfg", "\nhubble 7\n", deeper);
  snprintf(wanted, sizeof wanted, "%s:2: syntax error in \"hubble 7\"", deeper);
  expect_refusal(f, top, wanted);
  WRITE(f, "sub/deeper.cfg", "hubble = 0.7;\n  @include \"deeper.cfg\"\n", deeper);
  snprintf(wanted, sizeof wanted,
           "%s:2: @include \"deeper.cfg\": more than ten files deep, does a file include itself?", deeper);
  expect_refusal(f, top, wanted);
  WRITE(f, "sub/deeper.cfg", "@include \"..\"\n", deeper);
  snprintf(wanted, sizeof wanted, "%s:1: @include \"..\": Is a directory", deeper);
  expect_refusal(f, top, wanted);
  unlink(deeper);
  snprintf(wanted, sizeof wanted, "%s:2: @include \"deeper.cfg\": No such file or directory", deep);
  expect_refusal(f, top, wanted);
  WRITE(f, "sub/deep.cfg", "@include \"/dev/null\"\nhubble = 0.6;\nhubble = 0.6;", deep);
  snprintf(wanted, sizeof wanted, "%s:3: cosmology.hubble = 0.6: set twice, first at %s:2" HUBBLE, deep, deep);
  expect_refusal(f, top, wanted);
  unlink(top);
  unlink(base);
  unlink(deep);
  rmdir(folder);
}

/* ----------------------------------------------------------------------------------------------- what is written */

static void expect_same_after_echo(const fixture *f) {
  char *text = ew_parameters_echo(&f->values);
  assert_non_null(text);
  target again;
  memset(&again, 0, sizeof again);
  ew_parameter_values values;
  ew_error error = {0};
  assert_int_equal(ew_parameters_open(&values, &table, &again, &error), EW_OK);
  ew_status status = ew_parameters_read_text(&values, text, "echo", &error);
  assert_string_equal(error.message, "");
  assert_int_equal(status, EW_OK);
  assert_memory_equal(&again.first, &f->target.first, sizeof again.first);
  assert_memory_equal(again.second.mass_range, f->target.second.mass_range, sizeof again.second.mass_range);
  assert_memory_equal(&again.second.mass, &f->target.second.mass, sizeof again.second.mass);
  assert_int_equal(again.second.count, f->target.second.count);
  assert_int_equal(again.second.kind, f->target.second.kind);
  assert_int_equal(again.second.follow, f->target.second.follow);
  assert_string_equal(again.second.file, f->target.second.file);
  ew_parameters_close(&values);
  free(text);
}

static void test_echo_is_plain_libconfig(void **state) {
  fixture *f = *state;
  accept_text(f, "random : { seed = 5000000000; }; trees : { file = \"a\\\"\\\\\\t\"; follow = false; };"
                 "cosmology : { hubble = 1; }; roots : { mass = 0.1; };");
  char *text = ew_parameters_echo(&f->values);
  assert_string_equal(text, "cosmology :\n{\n  hubble = 1.0;\n};\n"
                            "random :\n{\n  seed = 5000000000L;\n};\n"
                            "trees :\n{\n  follow = false;\n  file = \"a\\\"\\\\\\x09\";\n};\n"
                            "roots :\n{\n  kind = \"range\";\n  mass_range = [1e8, 3e10];\n  mass = 0.1;\n"
                            "  count = 10;\n};\n");
  free(text);
}

static void test_echo_reads_back_to_the_same_bits(void **state) {
  fixture *f = *state;
  static const double numbers[] = {0.0,
                                   -0.0,
                                   0.1,
                                   1e-300,
                                   1.0 / 3.0,
                                   0x1p53,
                                   0x1p53 + 2,
                                   5e-324,
                                   1e100,
                                   123456,
                                   1234567,
                                   1e22,
                                   1e23,
                                   EW_PI,
                                   1.7976931348623157e308,
                                   2e-308,
                                   100.0,
                                   1e5,
                                   99999.99999999999};
  for (size_t i = 0; i < sizeof numbers / sizeof *numbers; i++) {
    f->target.second.mass = numbers[i];
    expect_same_after_echo(f);
  }
  static const int64_t integers[] = {0,          1,         -1,         INT32_MAX, INT32_MIN,
                                     2147483648, INT64_MAX, -INT64_MAX, INT64_MIN, 5000000000};
  for (size_t i = 0; i < sizeof integers / sizeof *integers; i++) {
    f->target.first.seed = integers[i];
    expect_same_after_echo(f);
  }
}

static void test_echo_keeps_any_text(void **state) {
  fixture *f = *state;
  for (int c = 1; c < 256; c++) {
    snprintf(f->target.second.file, EW_TEXT_SIZE, "a%cb \"%c\" \\%c%c \\", c, c, c, c);
    expect_same_after_echo(f);
  }
  memset(f->target.second.file, '\\', EW_TEXT_SIZE - 1);
  expect_same_after_echo(f);
  strcpy(f->target.second.file, "\\x00 // /* @include \"x\"\n@include \"x\"\n");
  expect_same_after_echo(f);
}

static void test_echo_keeps_random_numbers(void **state) {
  fixture *f = *state;
  ew_stream stream = ew_stream_open(&(ew_draws){.seed = 1}, EW_PROCESS_ROOTS, 0, 0);
  for (int i = 0; i < 2000; i++) {
    f->target.second.mass = exp(1400.0 * (ew_draw_uniform(&stream) - 0.5));
    f->target.second.mass_range[0] = 1e6 * exp(10.0 * ew_draw_uniform(&stream));
    f->target.second.mass_range[1] = f->target.second.mass_range[0] * (1.0 + ew_draw_uniform(&stream));
    f->target.first.seed = (int64_t)ew_draw_word(&stream);
    expect_same_after_echo(f);
  }
}

enum { PRINT_SIZE = 16384 };

static void print_into(char text[PRINT_SIZE], const ew_parameter_table *printed) {
  memset(text, 0, PRINT_SIZE);
  FILE *out = fmemopen(text, PRINT_SIZE - 1, "w");
  assert_non_null(out);
  ew_parameters_print(printed, out);
  assert_int_equal(fclose(out), 0);
}

static void expect_within(const char *text, const char *wanted) {
  if (!text || !strstr(text, wanted))
    fail_msg("\"%s\" is not in the print", wanted);
}

static size_t times_within(const char *text, const char *wanted) {
  size_t times = 0;
  for (const char *at = strstr(text, wanted); at; at = strstr(at + 1, wanted))
    times++;
  return times;
}

static void test_print_tells_every_row(void **state) {
  (void)state;
  char text[PRINT_SIZE];
  print_into(text, &table);
  for (size_t i = 0; i < ew_parameters_count(&table); i++) {
    const ew_parameter *row = ew_parameters_row(&table, i);
    expect_within(text, row->name);
    const char *described = strstr(text, row->name);
    expect_within(described, row->unit);
    expect_within(described, row->standard);
    expect_within(described, row->meaning);
    expect_within(described, row->source);
  }
  assert_int_equal(times_within(text, "default"), 4); /* one heading for each prefix */
  assert_int_equal(times_within(text, "The tree file."), 1);
  for (const ew_choice *choice = kinds; choice->name; choice++) {
    expect_within(text, choice->name);
    expect_within(text, choice->meaning);
  }
  expect_within(text, "a number from 0.2 to 1.5\n");
  expect_within(text, "[low, high] from 1e6 to 1e16 Msun\n");
}

static void expect_page_width(const char *text) {
  for (const char *line = text; *line; line += strcspn(line, "\n") + 1)
    assert_in_range(strcspn(line, "\n"), 0, 110);
}

static void test_print_fits_the_page(void **state) {
  (void)state;
  char text[PRINT_SIZE], meaning[600] = "";
  print_into(text, &table);
  expect_page_width(text);
  while (strlen(meaning) < 500)
    strcat(meaning, "seven and twenty words, ");
  const ew_choice long_choices[] = {{"wordy", meaning, "own choice"}, {NULL, NULL, NULL}};
  const ew_parameter rows[] = {{"a.b", EW_CHOICE, 0, "", "\"wordy\"", 0, 0, long_choices, meaning, "own choice"},
                               {.name = NULL}};
  const ew_parameter_group group = {rows, 0};
  print_into(text, &(const ew_parameter_table){&group, 1});
  expect_page_width(text);
  assert_int_equal(times_within(text, "twenty"), 2 * times_within(meaning, "twenty"));
}

static void test_checks_between_parameters_are_told_alike(void **state) {
  fixture *f = *state;
  accept_text(f, "roots : {\n mass_range = [1e9, 2e9];\n};");
  assert_int_equal(ew_parameters_refuse(&f->values, "roots.mass_range", &f->error, "below the resolution %s", "1e10"),
                   EW_REFUSED);
  assert_string_equal(f->error.message, "f.cfg:2: roots.mass_range = [1e9, 2e9]: below the resolution 1e10");
  f->error = (ew_error){0};
  assert_int_equal(ew_parameters_refuse(&f->values, "roots.count", &f->error, "why"), EW_REFUSED);
  assert_string_equal(f->error.message, "default: roots.count = 10: why");
}

/* ---------------------------------------------------------------------------------------- structs without engine */

static void expect_struct_refusal(const second_part *parameters, const char *message) {
  ew_error error = {0};
  assert_int_equal(ew_rows_check(second_rows, parameters, &error), EW_REFUSED);
  assert_string_equal(error.message, message);
}

static void test_a_struct_is_checked_against_its_rows(void **state) {
  fixture *f = *state;
  assert_int_equal(ew_rows_count(first_rows), 2);
  assert_int_equal(ew_rows_count(second_rows), 6);
  second_part *parameters = &f->target.second;
  assert_int_equal(ew_rows_check(second_rows, parameters, &f->error), EW_OK);
  parameters->mass = -1.0;
  expect_struct_refusal(parameters, "roots.mass = -1 is outside 0 to inf");
  parameters->mass = (double)NAN;
  expect_struct_refusal(parameters, "roots.mass = nan is outside 0 to inf");
  parameters->kind = 3;
  expect_struct_refusal(parameters, "roots.kind = 3 is none of its 3 choices");
  parameters->kind = -1;
  expect_struct_refusal(parameters, "roots.kind = -1 is none of its 3 choices");
}

/* ---------------------------------------------------------------------------------------------------- bad tables */

static void expect_bad_row(ew_parameter row, const char *message) {
  const ew_parameter rows[] = {first_rows[0], row, {.name = NULL}};
  const ew_parameter_group group = {rows, 0};
  const ew_parameter_table bad = {&group, 1};
  target filled;
  ew_parameter_values values;
  ew_error error = {0};
  assert_int_equal(ew_parameters_open(&values, &bad, &filled, &error), EW_FAILED);
  assert_string_equal(error.message, message);
  ew_parameters_close(&values);
}

static void test_a_bad_row_is_named(void **state) {
  (void)state;
  ew_parameter row = {"a.b", EW_REAL, 0, "1", "3", 0, 2, NULL, "Meaning.", "own choice"};
  expect_bad_row(row, "default: a.b = 3: out of range; allowed: a number from 0 to 2");
  row.standard = "grow";
  expect_bad_row(row, "default: a.b = grow: not a libconfig value; allowed: a number from 0 to 2");
  row.standard = "\"grow\"";
  expect_bad_row(row, "default: a.b = \"grow\": wrong type, this is text; allowed: a number from 0 to 2");
  row.standard = "1";
  row.low = (double)NAN;
  expect_bad_row(row, "default: a.b = 1: out of range; allowed: a number of at most 2");
  row.name = "ab";
  expect_bad_row(row, "default: ab: not a name of the form group.key, or not the only one");
  row.name = "cosmology.hubble";
  expect_bad_row(row, "default: cosmology.hubble: not a name of the form group.key, or not the only one");
}

static void test_an_empty_table_knows_no_name(void **state) {
  (void)state;
  const ew_parameter_table empty = {NULL, 0};
  ew_parameter_values values;
  ew_error error = {0};
  assert_int_equal(ew_parameters_open(&values, &empty, NULL, &error), EW_OK);
  assert_int_equal(ew_parameters_assign(&values, "a.b=1", "--set", &error), EW_REFUSED);
  assert_string_equal(error.message, "--set: a.b = 1: no parameter of that name");
  ew_parameters_close(&values);
}

#define ON_TABLE(test) cmocka_unit_test_setup_teardown(test, open_table, close_table)

int main(void) {
  const struct CMUnitTest tests[] = {cmocka_unit_test(test_rows_are_counted_through_all_groups),
                                     ON_TABLE(test_defaults_are_set),
                                     ON_TABLE(test_every_type_is_read_with_its_origin),
                                     ON_TABLE(test_other_spellings_are_read),
                                     ON_TABLE(test_later_reads_win),
                                     ON_TABLE(test_files_are_refused_in_one_line),
                                     ON_TABLE(test_a_refusal_needs_no_error_to_fill),
                                     ON_TABLE(test_assignments_are_refused_in_one_line),
                                     ON_TABLE(test_assignments_are_read),
                                     ON_TABLE(test_assigned_text_needs_no_quotes),
                                     ON_TABLE(test_text_is_bounded),
                                     ON_TABLE(test_messages_stay_short_and_plain),
                                     ON_TABLE(test_damaged_text_does_no_harm),
                                     ON_TABLE(test_unreadable_files_are_refused),
                                     ON_TABLE(test_a_long_path_keeps_its_end),
                                     ON_TABLE(test_includes_are_spliced_in),
                                     ON_TABLE(test_echo_is_plain_libconfig),
                                     ON_TABLE(test_echo_reads_back_to_the_same_bits),
                                     ON_TABLE(test_echo_keeps_any_text),
                                     ON_TABLE(test_echo_keeps_random_numbers),
                                     cmocka_unit_test(test_print_tells_every_row),
                                     cmocka_unit_test(test_print_fits_the_page),
                                     ON_TABLE(test_checks_between_parameters_are_told_alike),
                                     ON_TABLE(test_a_struct_is_checked_against_its_rows),
                                     cmocka_unit_test(test_a_bad_row_is_named),
                                     cmocka_unit_test(test_an_empty_table_knows_no_name)};
  return cmocka_run_group_tests(tests, NULL, NULL);
}
