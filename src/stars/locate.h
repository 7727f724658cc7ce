/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Where a value lies between the nodes of a published table, which are seldom evenly spaced. */
#ifndef EW_STARS_LOCATE_H
#define EW_STARS_LOCATE_H

#include <stddef.h>

/* Between node `index` (weight 1 - weight) and the next one (weight). */
typedef struct {
  size_t index;
  double weight;
} ew_place;

/* `node` ascending, `count` >= 2. Outside the nodes, and for NaN, the nearest end (NaN: the first). */
static inline ew_place ew_locate(const double *node, size_t count, double x) {
  if (!(x > node[0]))
    return (ew_place){0, 0.0};
  if (x >= node[count - 1])
    return (ew_place){count - 2, 1.0};
  size_t low = 0, high = count - 1;
  while (high - low > 1) {
    size_t middle = (low + high) / 2;
    if (x >= node[middle])
      low = middle;
    else
      high = middle;
  }
  return (ew_place){low, (x - node[low]) / (node[low + 1] - node[low])};
}

static inline double ew_between(double a, double b, double weight) {
  return a + weight * (b - a);
}

#endif
