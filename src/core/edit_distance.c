/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The distance between two names, row by row of the usual table of costs. */
#include "core/edit_distance.h"

enum { LONGEST_COMPARED = 64 };

static size_t least(size_t a, size_t b) {
  return a < b ? a : b;
}

size_t ew_edit_distance(const char *a, size_t a_length, const char *b, size_t b_length) {
  size_t cost[LONGEST_COMPARED + 1];
  a_length = least(a_length, LONGEST_COMPARED);
  b_length = least(b_length, LONGEST_COMPARED);
  for (size_t j = 0; j <= b_length; j++)
    cost[j] = j;
  for (size_t i = 1; i <= a_length; i++) {
    size_t diagonal = cost[0];
    cost[0] = i;
    for (size_t j = 1; j <= b_length; j++) {
      size_t substituted = diagonal + (a[i - 1] != b[j - 1]);
      diagonal = cost[j];
      cost[j] = least(substituted, 1 + least(cost[j], cost[j - 1]));
    }
  }
  return cost[b_length];
}
