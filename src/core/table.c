/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Tables on uniform grids: allocation; look-ups are inline in the header. */
#include "elfinwood/core.h"

#include <math.h>
#include <stdlib.h>

ew_status ew_table_make(ew_table *table, double first, double last, size_t count, ew_error *error) {
  *table = (ew_table){0};
  if (count < 2 || !(last > first) || !isfinite(last - first))
    return ew_fail(error, EW_FAILED, "a table needs two points and a range, got %zu from %g to %g", count, first, last);
  table->value = calloc(count, sizeof *table->value);
  if (!table->value)
    return ew_fail_memory(error, "a table");
  table->first = first;
  table->step = (last - first) / (double)(count - 1);
  table->inverse_step = 1.0 / table->step;
  table->count = count;
  return EW_OK;
}

void ew_table_clear(ew_table *table) {
  free(table->value);
  *table = (ew_table){0};
}
