/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Arena and tables: what is handed out, and what is looked up. */
#include "elfinwood/core.h"

#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

/* Requests that no memory can meet must give NULL under the address sanitizer too, which would rather stop. */
const char *__asan_default_options(void);
const char *__asan_default_options(void) {
  return "allocator_may_return_null=1";
}

/* cmocka's own comparison is in single precision. */
static void expect_close(double found, double wanted, double tolerance) {
  if (!(fabs(found - wanted) <= tolerance))
    fail_msg("%.17g is not within %g of %.17g", found, tolerance, wanted);
}

static int open_arena(void **state) {
  *state = ew_arena_new();
  return !*state;
}

static int close_arena(void **state) {
  ew_arena_free(*state);
  ew_arena_free(NULL);
  return 0;
}

static bool is_all(const unsigned char *bytes, size_t size, unsigned char value) {
  for (size_t i = 0; i < size; i++)
    if (bytes[i] != value)
      return false;
  return true;
}

static void test_pieces_are_aligned_zeroed_and_apart(void **state) {
  enum { PIECES = 2000 };
  unsigned char *piece[PIECES];
  for (int round = 0; round < 2; round++) { /* the second time on used memory */
    for (size_t i = 0; i < PIECES; i++) {
      piece[i] = ew_arena_take(*state, i + 1);
      assert_non_null(piece[i]);
      assert_int_equal((uintptr_t)piece[i] % _Alignof(max_align_t), 0);
      assert_true(is_all(piece[i], i + 1, 0));
      memset(piece[i], (int)(i % 255) + 1, i + 1);
    }
    for (size_t i = 0; i < PIECES; i++)
      assert_true(is_all(piece[i], i + 1, (unsigned char)(i % 255 + 1)));
    ew_arena_return(*state, (ew_arena_mark){0});
  }
}

static void test_a_mark_keeps_what_came_before(void **state) {
  unsigned char *kept = ew_arena_take(*state, 100);
  memset(kept, 7, 100);
  ew_arena_mark mark = ew_arena_tell(*state);
  unsigned char *first = ew_arena_take(*state, 50);
  memset(first, 8, 50);
  memset(ew_arena_take(*state, 1 << 20), 9, 1 << 20); /* into a block of its own */
  ew_arena_return(*state, mark);
  unsigned char *again = ew_arena_take(*state, 50);
  assert_ptr_equal(again, first);
  assert_true(is_all(again, 50, 0));
  assert_true(is_all(kept, 100, 7));
}

static void test_marks_nest(void **state) {
  ew_arena_mark outer = ew_arena_tell(*state);
  char *a = ew_arena_take(*state, 10);
  ew_arena_mark inner = ew_arena_tell(*state);
  for (int i = 0; i < 3; i++) {
    char *b = ew_arena_take(*state, 200000);
    assert_non_null(b);
    ew_arena_return(*state, inner);
  }
  ew_arena_return(*state, outer);
  assert_non_null(a);
  assert_non_null(ew_arena_take(*state, 10));
}

/* Takes what the heap has to offer in the sizes of the arena's blocks, so that a block which the arena had freed would
 * be gone. */
enum { GRABS = 8 };

static void grab(void *grabbed[GRABS]) {
  for (size_t i = 0; i < GRABS; i++)
    grabbed[i] = malloc(((size_t)1 << (16 + i)) + 32);
}

static void let_go(void *grabbed[GRABS]) {
  for (size_t i = 0; i < GRABS; i++)
    free(grabbed[i]);
}

/* Once warm, a loop that takes and returns the same gets the same addresses, so it asks the heap for nothing. */
static void test_a_warm_loop_leaves_the_heap_alone(void **state) {
  enum { WARM_UP = 10, TURNS = 100, PIECES = 3, PIECE_SIZE = 100000 };
  assert_non_null(ew_arena_take(*state, 1000));
  ew_arena_mark mark = ew_arena_tell(*state);
  void *settled[PIECES] = {NULL}, *piece[PIECES], *grabbed[GRABS];
  for (int turn = 0; turn < TURNS; turn++) {
    for (int i = 0; i < PIECES; i++)
      piece[i] = ew_arena_take(*state, PIECE_SIZE);
    if (turn > WARM_UP)
      let_go(grabbed);
    if (turn == WARM_UP)
      memcpy(settled, piece, sizeof settled);
    else if (turn > WARM_UP)
      assert_memory_equal(piece, settled, sizeof settled);
    ew_arena_return(*state, mark);
    if (turn >= WARM_UP)
      grab(grabbed);
  }
  let_go(grabbed);
}

static void test_a_huge_request_gives_null(void **state) {
  unsigned char *before = ew_arena_take(*state, 10);
  memset(before, 3, 10);
  assert_null(ew_arena_take(*state, SIZE_MAX));
  assert_null(ew_arena_take(*state, SIZE_MAX / 2));
  assert_null(ew_arena_take(*state, SIZE_MAX / 4 + 1));
  assert_null(ew_arena_take(*state, SIZE_MAX / 4));
  assert_true(is_all(before, 10, 3));
  assert_non_null(ew_arena_take(*state, 10)); /* and harms nothing */
}

/* -------------------------------------------------------------------------------------------------------- tables */

static void test_a_line_is_interpolated_exactly(void **state) {
  (void)state;
  const double rounding = 1e-13; /* of the place on the grid, times the slope */
  ew_table table;
  ew_error error = {0};
  assert_int_equal(ew_table_make(&table, -2.385, 7.14, 38, &error), EW_OK);
  assert_int_equal(table.count, 38);
  for (size_t i = 0; i < table.count; i++)
    table.value[i] = 3.7 - 1.3 * ew_table_position(&table, i);
  expect_close(ew_table_position(&table, 0), -2.385, 0);
  expect_close(ew_table_position(&table, 37), 7.14, 1e-14);
  for (double x = -2.385; x <= 7.14; x += 0.0173)
    expect_close(ew_table_at(&table, x), 3.7 - 1.3 * x, rounding);
  ew_table_clear(&table);
  assert_null(table.value);
  ew_table_clear(&table);
}

static void test_a_kinked_table_is_met_at_and_between_its_points(void **state) {
  (void)state;
  ew_table table;
  assert_int_equal(ew_table_make(&table, 1.0, 4.0, 4, NULL), EW_OK);
  memcpy(table.value, (const double[]){5.0, -1.0, 2.0, 2.5}, 4 * sizeof(double));
  static const double x[] = {1.0, 1.25, 2.0, 2.5, 3.0, 3.75, 4.0};
  static const double y[] = {5.0, 3.5, -1.0, 0.5, 2.0, 2.375, 2.5};
  for (size_t i = 0; i < sizeof x / sizeof *x; i++)
    expect_close(ew_table_at(&table, x[i]), y[i], 1e-15);
  ew_table_clear(&table);
}

static void test_outside_the_grid_the_end_values_stand(void **state) {
  (void)state;
  ew_table table;
  assert_int_equal(ew_table_make(&table, 1.0, 3.0, 3, NULL), EW_OK);
  memcpy(table.value, (const double[]){5.0, -1.0, 2.0}, 3 * sizeof(double));
  static const double below[] = {0.999999, -1e300, -HUGE_VAL}, above[] = {3.0000001, 1e300, HUGE_VAL};
  for (size_t i = 0; i < 3; i++) {
    expect_close(ew_table_at(&table, below[i]), 5.0, 0);
    expect_close(ew_table_at(&table, above[i]), 2.0, 0);
  }
  ew_table_clear(&table);
}

/* Not a place on the grid: whatever comes back, it reads no memory that is not the table's. */
static void test_nan_reads_an_end_value(void **state) {
  (void)state;
  ew_table table;
  assert_int_equal(ew_table_make(&table, 1.0, 3.0, 3, NULL), EW_OK);
  table.value[0] = 5.0;
  expect_close(ew_table_at(&table, (double)NAN), 5.0, 0);
  ew_table_clear(&table);
}

static void test_a_table_without_a_range_is_refused(void **state) {
  (void)state;
  const struct {
    double first, last;
    size_t count;
  } bad[] = {{1.0, 2.0, 1},         {1.0, 2.0, 0},      {2.0, 2.0, 5},       {3.0, 2.0, 5},
             {(double)NAN, 2.0, 5}, {1.0, HUGE_VAL, 5}, {-HUGE_VAL, 1.0, 5}, {-1.7e308, 1.7e308, 5}};
  for (size_t i = 0; i < sizeof bad / sizeof *bad; i++) {
    ew_table table;
    ew_error error = {0};
    assert_int_equal(ew_table_make(&table, bad[i].first, bad[i].last, bad[i].count, &error), EW_FAILED);
    assert_non_null(strstr(error.message, "a table needs two points and a range"));
    assert_null(table.value);
    ew_table_clear(&table);
  }
}

static void test_a_table_beyond_memory_is_told(void **state) {
  (void)state;
  ew_table table;
  ew_error error = {0};
  assert_int_equal(ew_table_make(&table, 0.0, 1.0, SIZE_MAX / 4, &error), EW_FAILED);
  assert_string_equal(error.message, "out of memory for a table");
  ew_table_clear(&table);
}

/* -------------------------------------------------------------------------------------------------------- errors */

static void test_the_first_failure_is_told(void **state) {
  (void)state;
  ew_error error = {0};
  assert_int_equal(ew_fail(&error, EW_REFUSED, "first %d", 1), EW_REFUSED);
  assert_int_equal(ew_fail(&error, EW_FAILED, "second"), EW_FAILED);
  assert_int_equal(error.status, EW_REFUSED);
  assert_string_equal(error.message, "first 1");
  assert_int_equal(ew_fail(NULL, EW_FAILED, "nobody listens"), EW_FAILED);
}

static void test_a_message_is_one_plain_line(void **state) {
  (void)state;
  ew_error error = {0};
  ew_fail(&error, EW_FAILED,
          "a\nb\tc\x1b[31m\x7f\xc2\x9b"
          "d\xc3\xa9");
  assert_string_equal(error.message, "a b c?[31m???d\xc3\xa9");
  char text[2 * EW_MESSAGE_SIZE];
  memset(text, 'x', sizeof text);
  text[sizeof text - 1] = '\0';
  error = (ew_error){0};
  ew_fail(&error, EW_FAILED, "%s", text);
  assert_int_equal(strlen(error.message), EW_MESSAGE_SIZE - 1);
}

#define ON_ARENA(test) cmocka_unit_test_setup_teardown(test, open_arena, close_arena)

int main(void) {
  const struct CMUnitTest tests[] = {ON_ARENA(test_pieces_are_aligned_zeroed_and_apart),
                                     ON_ARENA(test_a_mark_keeps_what_came_before),
                                     ON_ARENA(test_marks_nest),
                                     ON_ARENA(test_a_warm_loop_leaves_the_heap_alone),
                                     ON_ARENA(test_a_huge_request_gives_null),
                                     cmocka_unit_test(test_a_line_is_interpolated_exactly),
                                     cmocka_unit_test(test_a_kinked_table_is_met_at_and_between_its_points),
                                     cmocka_unit_test(test_outside_the_grid_the_end_values_stand),
                                     cmocka_unit_test(test_nan_reads_an_end_value),
                                     cmocka_unit_test(test_a_table_without_a_range_is_refused),
                                     cmocka_unit_test(test_a_table_beyond_memory_is_told),
                                     cmocka_unit_test(test_the_first_failure_is_told),
                                     cmocka_unit_test(test_a_message_is_one_plain_line)};
  return cmocka_run_group_tests(tests, NULL, NULL);
}
