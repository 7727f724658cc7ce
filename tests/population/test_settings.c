/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The registry of all parameters, row by row: whoever adds a row or a process has it tested here without a line. */
#include "ensemble.h"

#include <inttypes.h>

/* The groups that a parameter file may have. */
static const char *const known_groups[] = {"cosmology",   "spectrum",   "roots",          "trees",     "reionization",
                                           "first_stars", "gas",        "star_formation", "feedback",  "enrichment",
                                           "sizes",       "satellites", "survey",         "structure", "light",
                                           "random",      "ensemble",   "output"};

enum { RANDOM_SETTINGS = 200, LONGEST_ASSIGNMENT = 400 };

typedef struct {
  ew_settings settings;
  ew_parameter_values values;
} fixture;

static int open_settings(void **state) {
  fixture *f = calloc(1, sizeof *f);
  *state = f;
  return !f || ew_parameters_open(&f->values, ew_settings_table(), &f->settings, NULL) != EW_OK;
}

static int close_settings(void **state) {
  fixture *f = *state;
  ew_parameters_close(&f->values);
  free(f);
  return 0;
}

static size_t row_count(void) {
  return ew_parameters_count(ew_settings_table());
}

static const ew_parameter *row_at(size_t index) {
  return ew_parameters_row(ew_settings_table(), index);
}

/* Where a row's field lies in ew_settings. */
static size_t place_of(size_t index) {
  const ew_parameter_table *table = ew_settings_table();
  const ew_parameter_group *group = table->groups;
  size_t count;
  for (; index >= (count = ew_rows_count(group->rows)); group++)
    index -= count;
  return group->offset + group->rows[index].offset;
}

static size_t size_of(const ew_parameter *row) {
  static const size_t sizes[] = {
      [EW_REAL] = sizeof(double), [EW_INTEGER] = sizeof(int64_t), [EW_FLAG] = sizeof(bool),
      [EW_CHOICE] = sizeof(int),  [EW_TEXT] = EW_TEXT_SIZE,       [EW_INTERVAL] = 2 * sizeof(double)};
  return sizes[row->type];
}

static void *field_of(ew_settings *settings, size_t index) {
  return (char *)settings + place_of(index);
}

static bool is_number(const ew_parameter *row) {
  return row->type == EW_REAL || row->type == EW_INTEGER || row->type == EW_INTERVAL;
}

static ew_status assign(fixture *f, const char *name, const char *value, ew_error *error) {
  char assignment[LONGEST_ASSIGNMENT];
  *error = (ew_error){0};
  snprintf(assignment, sizeof assignment, "%s=%s", name, value);
  return ew_parameters_assign(&f->values, assignment, "test", error);
}

static void assert_taken(fixture *f, const ew_parameter *row, const char *value) {
  ew_error error;
  if (assign(f, row->name, value, &error) != EW_OK)
    fail_msg("%s = %s was refused: %s", row->name, value, error.message);
}

static void assert_refused(fixture *f, const ew_parameter *row, const char *value) {
  ew_error error;
  ew_settings before = f->settings;
  if (assign(f, row->name, value, &error) != EW_REFUSED)
    fail_msg("%s = %s was not refused", row->name, value);
  assert_non_null(strstr(error.message, row->name));
  assert_null(strchr(error.message, '\n'));
  assert_memory_equal(&before, &f->settings, sizeof before);
}

/* ------------------------------------------------------------------------------------------------------------- rows */

static bool is_known_group(const char *name, size_t length) {
  for (size_t i = 0; i < sizeof known_groups / sizeof *known_groups; i++)
    if (strlen(known_groups[i]) == length && strncmp(known_groups[i], name, length) == 0)
      return true;
  return false;
}

static void names_are_unique_and_of_known_groups(void **state) {
  (void)state;
  for (size_t i = 0; i < row_count(); i++) {
    const char *name = row_at(i)->name;
    size_t group = strcspn(name, "."), found;
    if (!is_known_group(name, group) || strlen(name) < group + 2 || strchr(name + group + 1, '.'))
      fail_msg("%s is not a key of a known group", name);
    assert_ptr_equal(ew_parameters_find(ew_settings_table(), name, &found), row_at(i));
    assert_int_equal(found, i);
  }
}

static void every_row_says_what_it_is(void **state) {
  (void)state;
  for (size_t i = 0; i < row_count(); i++) {
    const ew_parameter *row = row_at(i);
    if (!row->unit || !row->meaning || !row->source || !*row->meaning || !*row->source)
      fail_msg("%s lacks unit, meaning or source", row->name);
    if (is_number(row) != (strlen(row->unit) > 0))
      fail_msg("%s: numbers have a unit, perhaps 1; names and flags have none", row->name);
    if (is_number(row) && !(row->low < row->high && isfinite(row->low) && isfinite(row->high)))
      fail_msg("%s has no range", row->name);
    if ((row->type == EW_CHOICE) != (row->choices != NULL))
      fail_msg("%s: choices belong to a row of type choice", row->name);
    for (const ew_choice *c = row->choices; c && c->name; c++)
      if (!c->meaning || !c->source || !*c->meaning || !*c->source)
        fail_msg("%s: choice %s lacks meaning or source", row->name, c->name);
  }
}

/* No byte belongs to two rows, and no word of the settings to none: there is no parameter that cannot be set. */
static void rows_share_no_bytes_and_leave_no_field(void **state) {
  (void)state;
  static unsigned char owners[sizeof(ew_settings)];
  for (size_t i = 0; i < row_count(); i++) {
    size_t place = place_of(i), size = size_of(row_at(i));
    assert_true(place + size <= sizeof(ew_settings));
    for (size_t k = place; k < place + size; k++)
      if (owners[k]++)
        fail_msg("%s shares bytes with a row before it", row_at(i)->name);
  }
  static const unsigned char none[sizeof(double)];
  for (size_t k = 0; k < sizeof(ew_settings); k += sizeof none)
    if (memcmp(owners + k, none, sizeof none) == 0)
      fail_msg("no row fills the word at byte %zu of ew_settings", k);
}

static void defaults_are_inside(void **state) {
  fixture *f = *state;
  for (size_t i = 0; i < row_count(); i++) {
    const ew_parameter *row = row_at(i);
    const double *real = field_of(&f->settings, i);
    if (row->type == EW_REAL || row->type == EW_INTERVAL)
      for (size_t k = 0; k < size_of(row) / sizeof *real; k++)
        if (!(real[k] >= row->low && real[k] <= row->high))
          fail_msg("%s is %g by default", row->name, real[k]);
    if (row->type == EW_INTEGER) {
      double whole = (double)*(int64_t *)field_of(&f->settings, i);
      assert_true(whole >= row->low && whole <= row->high);
    }
  }
  ew_error error = {0};
  need_success(ew_settings_check(&f->values, &error), &error);
}

/* ----------------------------------------------------------------------------------------------------------- values */

typedef struct {
  char text[120];
} value;

static value real(double x) {
  value v;
  snprintf(v.text, sizeof v.text, "%.17g", x);
  return v;
}

static value whole(double x) {
  value v;
  snprintf(v.text, sizeof v.text, "%" PRId64, (int64_t)x);
  return v;
}

static value interval(double low, double high) {
  value v;
  snprintf(v.text, sizeof v.text, "[%.17e, %.17e]", low, high);
  return v;
}

static void try_real(fixture *f, size_t index) {
  const ew_parameter *row = row_at(index);
  const double *field = field_of(&f->settings, index);
  assert_taken(f, row, real(row->low).text);
  assert_true(*field == row->low);
  assert_taken(f, row, real(row->high).text);
  assert_true(*field == row->high);
  assert_refused(f, row, real(nextafter(row->low, -INFINITY)).text);
  assert_refused(f, row, real(nextafter(row->high, INFINITY)).text);
}

static void try_integer(fixture *f, size_t index) {
  const ew_parameter *row = row_at(index);
  const int64_t *field = field_of(&f->settings, index);
  assert_taken(f, row, whole(row->low).text);
  assert_true(*field == (int64_t)row->low);
  assert_taken(f, row, whole(row->high).text);
  assert_true(*field == (int64_t)row->high);
  assert_refused(f, row, whole(row->low - 1.0).text);
  assert_refused(f, row, whole(fmax(row->high + 1.0, nextafter(row->high, INFINITY))).text);
}

static void try_interval(fixture *f, size_t index) {
  const ew_parameter *row = row_at(index);
  const double *field = field_of(&f->settings, index);
  assert_taken(f, row, interval(row->low, row->high).text);
  assert_true(field[0] == row->low && field[1] == row->high);
  assert_refused(f, row, interval(nextafter(row->low, -INFINITY), row->high).text);
  assert_refused(f, row, interval(row->low, nextafter(row->high, INFINITY)).text);
  assert_refused(f, row, interval(row->high, row->low).text);
  assert_refused(f, row, "[1.0]");
  assert_refused(f, row, "[1.0, 2.0, 3.0]");
}

static void try_choices(fixture *f, size_t index) {
  const ew_parameter *row = row_at(index);
  for (int k = 0; row->choices[k].name; k++) {
    assert_taken(f, row, row->choices[k].name);
    assert_int_equal(*(int *)field_of(&f->settings, index), k);
  }
  assert_refused(f, row, "no_such_choice");
}

static void try_flag(fixture *f, size_t index) {
  const bool *field = field_of(&f->settings, index);
  assert_taken(f, row_at(index), "true");
  assert_true(*field);
  assert_taken(f, row_at(index), "false");
  assert_false(*field);
}

static void values_are_taken_up_to_their_limits(void **state) {
  fixture *f = *state;
  static void (*const attempt[])(fixture *, size_t) = {
      [EW_REAL] = try_real,      [EW_INTEGER] = try_integer, [EW_INTERVAL] = try_interval,
      [EW_CHOICE] = try_choices, [EW_FLAG] = try_flag,       [EW_TEXT] = NULL};
  for (size_t i = 0; i < row_count(); i++)
    if (attempt[row_at(i)->type])
      attempt[row_at(i)->type](f, i);
}

static void what_is_no_number_is_refused(void **state) {
  fixture *f = *state;
  static const char *const numbers[] = {"nan", "NaN", "inf", "-inf", "Infinity", "1e999", "-1e999", ""};
  static const char *const intervals[] = {"[nan, 1e9]", "[1.0, inf]", "[-1e999, 1e999]", "[]", ""};
  for (size_t i = 0; i < row_count(); i++) {
    const ew_parameter *row = row_at(i);
    for (size_t k = 0; k < sizeof numbers / sizeof *numbers && is_number(row); k++)
      assert_refused(f, row, numbers[k]);
    for (size_t k = 0; k < sizeof intervals / sizeof *intervals && row->type == EW_INTERVAL; k++)
      assert_refused(f, row, intervals[k]);
  }
}

static void wrong_types_are_refused(void **state) {
  fixture *f = *state;
  enum { MOST = 7 };
  static const char *const wrong[][MOST] = {
      [EW_REAL] = {"true", "text", "\"1.0\"", "[1.0, 2.0]", "(1.0, 2.0)", "{ a = 1; }", "1.0 2.0"},
      [EW_INTEGER] = {"1.5", "1.0", "1e3", "true", "text", "[1, 2]", "99999999999999999999"},
      [EW_FLAG] = {"1", "0", "yes", "\"true\"", "1.0", "[true, false]", ""},
      [EW_CHOICE] = {"1", "0", "true", "1.0", "[\"none\"]", "", "\"none"},
      [EW_INTERVAL] = {"1.0", "true", "text", "[true, false]", "[\"1\", \"2\"]", "[[1.0, 2.0]]", "1.0, 2.0"},
      [EW_TEXT] = {"1", "1.0", "true", "[1]", "(1)", "{ a = 1; }", "[\"a\"]"},
  };
  for (size_t i = 0; i < row_count(); i++)
    for (int k = 0; k < MOST; k++)
      assert_refused(f, row_at(i), wrong[row_at(i)->type][k]);
}

/* ------------------------------------------------------------------------------------------------------------ names */

static void assert_meant(fixture *f, const char *misspelt, const char *meant) {
  ew_error error;
  char question[LONGEST_ASSIGNMENT];
  snprintf(question, sizeof question, "did you mean %s?", meant);
  if (assign(f, misspelt, "1", &error) != EW_REFUSED)
    fail_msg("%s was not refused", misspelt);
  if (!strstr(error.message, misspelt) || !strstr(error.message, question))
    fail_msg("%s should suggest %s: %s", misspelt, meant, error.message);
}

static void misspelt_names_find_their_row(void **state) {
  fixture *f = *state;
  for (size_t i = 0; i < row_count(); i++) {
    const char *name = row_at(i)->name;
    size_t length = strlen(name), group = strcspn(name, ".");
    char wrong[120];
    snprintf(wrong, sizeof wrong, "%.*s", (int)length - 1, name);
    assert_meant(f, wrong, name);
    snprintf(wrong, sizeof wrong, "%.*sx%s", (int)group + 2, name, name + group + 2);
    assert_meant(f, wrong, name);
    snprintf(wrong, sizeof wrong, "%.*s%s", (int)group - 1, name, name + group);
    assert_meant(f, wrong, name);
  }
}

/* ------------------------------------------------------------------------------------------------------------- echo */

static double between(ew_stream *stream, const ew_parameter *row) {
  double u = ew_draw_uniform(stream);
  bool decades = row->low > 0.0 && row->high / row->low > 100.0;
  double x = decades ? row->low * pow(row->high / row->low, u) : row->low + u * (row->high - row->low);
  return fmin(fmax(x, row->low), row->high);
}

static void draw_value(ew_stream *stream, const ew_parameter *row, void *field) {
  double *x = field;
  int choices = 0;
  while (row->type == EW_CHOICE && row->choices[choices].name)
    choices++;
  if (row->type == EW_REAL || row->type == EW_INTERVAL)
    *x = between(stream, row);
  if (row->type == EW_INTERVAL)
    x[1] = x[0] + ew_draw_uniform(stream) * (row->high - x[0]);
  if (row->type == EW_INTEGER)
    *(int64_t *)field = (int64_t)between(stream, row);
  if (row->type == EW_FLAG)
    *(bool *)field = ew_draw_uniform(stream) < 0.5;
  if (row->type == EW_CHOICE)
    *(int *)field = (int)(ew_draw_uniform(stream) * choices);
}

static void assert_same_fields(ew_settings *a, ew_settings *b) {
  for (size_t i = 0; i < row_count(); i++)
    if (memcmp(field_of(a, i), field_of(b, i), size_of(row_at(i))) != 0)
      fail_msg("%s changed on its way through text", row_at(i)->name);
}

static void the_echo_reads_back_to_the_same_bits(void **state) {
  fixture *f = *state;
  for (uint64_t n = 0; n < RANDOM_SETTINGS; n++) {
    ew_draws draws = {.seed = 2385, .tree = n};
    ew_stream stream = ew_stream_open(&draws, EW_PROCESS_SURVEY, 0, 0);
    for (size_t i = 0; i < row_count(); i++)
      draw_value(&stream, row_at(i), field_of(&f->settings, i));
    char *text = ew_parameters_echo(&f->values);
    assert_non_null(text);
    ew_settings again;
    ew_parameter_values values;
    ew_error error = {0};
    need_success(ew_parameters_open(&values, ew_settings_table(), &again, &error), &error);
    need_success(ew_parameters_read_text(&values, text, "echo", &error), &error);
    assert_same_fields(&f->settings, &again);
    ew_parameters_close(&values);
    free(text);
  }
}

/* -------------------------------------------------------------------------------------------------------- processes */

static void every_process_is_described_and_registered(void **state) {
  (void)state;
  size_t count;
  const ew_process_record *const *processes = ew_processes(&count);
  assert_true(count > 0);
  for (size_t i = 0; i < count; i++) {
    const ew_process_record *p = processes[i];
    if (!p->name || !p->meaning || !p->source || !*p->name || !*p->meaning || !*p->source)
      fail_msg("process %zu lacks name, meaning or source", i);
    for (size_t k = 0; k < i; k++)
      assert_string_not_equal(p->name, processes[k]->name);
    assert_true(ew_rows_count(p->rows) > 0);
    for (const ew_parameter *row = p->rows; row->name; row++)
      assert_ptr_equal(ew_parameters_find(ew_settings_table(), row->name, NULL), row);
  }
}

/* ----------------------------------------------------------------------------------------------------------- checks */

typedef struct {
  const char *assignments[5];
  const char *at_fault; /* the parameter named; NULL: nothing is wrong */
} cross_check;

static const cross_check cross_checks[] = {
    {{"roots.kind=single", "roots.mass=3e5", "trees.resolution_mass=3e5"}, "roots.mass"},
    {{"roots.kind=single", "roots.mass=3.1e5", "trees.resolution_mass=3e5"}, NULL},
    {{"roots.kind=range", "roots.mass_range=[1e6, 1e9]", "trees.resolution_mass=1e6"}, "roots.mass_range"},
    {{"roots.kind=range", "roots.mass_range=[1.1e6, 1e9]", "trees.resolution_mass=1e6"}, NULL},
    /* what the kind chosen does not use is accepted */
    {{"roots.kind=range", "roots.mass=1e5", "trees.resolution_mass=1e6"}, NULL},
    {{"roots.kind=single", "roots.mass_range=[1e5, 1e6]", "trees.resolution_mass=1e6"}, NULL},
    {{"roots.redshift=10", "trees.highest_redshift=10"}, "roots.redshift"},
    {{"roots.redshift=9.9", "trees.highest_redshift=10"}, NULL},
    {{"star_formation.cluster_range=[100.0, 100.0]"}, "star_formation.cluster_range"},
    {{"first_stars.imf_range=[20.0, 20.0]"}, "first_stars.imf_range"},
};

static void checks_between_parameters_name_the_one_at_fault(void **state) {
  (void)state;
  for (size_t i = 0; i < sizeof cross_checks / sizeof *cross_checks; i++) {
    const cross_check *c = &cross_checks[i];
    ew_settings settings;
    ew_parameter_values values;
    ew_error error = {0};
    need_success(ew_parameters_open(&values, ew_settings_table(), &settings, &error), &error);
    for (int k = 0; c->assignments[k]; k++)
      need_success(ew_parameters_assign(&values, c->assignments[k], "--set", &error), &error);
    ew_status status = ew_settings_check(&values, &error);
    assert_int_equal(status, c->at_fault ? EW_REFUSED : EW_OK);
    if (c->at_fault) {
      char start[120];
      snprintf(start, sizeof start, "--set: %s = ", c->at_fault);
      assert_memory_equal(error.message, start, strlen(start));
    }
    ew_parameters_close(&values);
  }
}

int main(void) {
  ew_core_start();
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(names_are_unique_and_of_known_groups),
      cmocka_unit_test(every_row_says_what_it_is),
      cmocka_unit_test(rows_share_no_bytes_and_leave_no_field),
      cmocka_unit_test_setup_teardown(defaults_are_inside, open_settings, close_settings),
      cmocka_unit_test_setup_teardown(values_are_taken_up_to_their_limits, open_settings, close_settings),
      cmocka_unit_test_setup_teardown(what_is_no_number_is_refused, open_settings, close_settings),
      cmocka_unit_test_setup_teardown(wrong_types_are_refused, open_settings, close_settings),
      cmocka_unit_test_setup_teardown(misspelt_names_find_their_row, open_settings, close_settings),
      cmocka_unit_test_setup_teardown(the_echo_reads_back_to_the_same_bits, open_settings, close_settings),
      cmocka_unit_test(every_process_is_described_and_registered),
      cmocka_unit_test(checks_between_parameters_name_the_one_at_fault),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
