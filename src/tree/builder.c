/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The builder walks each branch from its latest node back in time. The mass drifts down by smooth loss; the next split
 * is where the hazard along the drift has grown by an exponential draw; the smaller part becomes a branch of its own,
 * whose walk waits on a stack. What comes out is the tree in reverse, so one reversal at the end gives the order of the
 * type.
 *
 * Split k of a branch draws from slot k of the branch's stream, whatever happened elsewhere. */
#include "tree/memory.h"
#include "tree/rates.h"

#include <math.h>
#include <stdlib.h>

#define LONGEST_STRIDE   0.35  /* of ln M between two nodes */
#define NODE_PRECISION   0.008 /* relative error of linear mass between nodes: the type promises 0.01 */
#define SHORTEST_STRIDE  0.01
#define LARGEST_ATTEMPTS 1000 /* of the rejection, which accepts about every second share */

struct ew_tree_builder {
  ew_split_tables tables;
  const ew_cosmology *cosmology;
  double largest_mass;
};

ew_status ew_tree_builder_new(ew_tree_builder **builder, const ew_spectrum *spectrum,
                              const ew_tree_parameters *parameters, double largest_mass, ew_error *error) {
  *builder = NULL;
  if (!(parameters->resolution_mass >= EW_LOWEST_MASS && largest_mass <= EW_HIGHEST_MASS))
    return ew_fail(error, EW_REFUSED, "trees from %g to %g Msun are outside the tables of sigma(M) (%g to %g Msun)",
                   parameters->resolution_mass, largest_mass, EW_LOWEST_MASS, EW_HIGHEST_MASS);
  if (!(parameters->resolution_mass < largest_mass))
    return ew_fail(error, EW_REFUSED,
                   "trees.resolution_mass = %g Msun leaves nothing to grow; allowed: below the largest root, %g Msun",
                   parameters->resolution_mass, largest_mass);
  ew_tree_builder *fresh = calloc(1, sizeof *fresh);
  if (!fresh)
    return ew_fail_memory(error, "the tree builder");
  fresh->cosmology = ew_spectrum_cosmology(spectrum);
  fresh->largest_mass = largest_mass;
  ew_status status = ew_split_tables_make(&fresh->tables, spectrum, parameters, largest_mass, error);
  if (status != EW_OK) {
    free(fresh);
    return status;
  }
  *builder = fresh;
  return EW_OK;
}

void ew_tree_builder_free(ew_tree_builder *builder) {
  if (!builder)
    return;
  ew_split_tables_clear(&builder->tables);
  free(builder);
}

double ew_split_rate(const ew_tree_builder *builder, double mass, double barrier) {
  return ew_split_rate_on_clock(&builder->tables, log(mass)) *
         pow(barrier, builder->tables.parameters.split_peak_slope);
}

double ew_smooth_rate(const ew_tree_builder *builder, double mass, double barrier) {
  return ew_smooth_rate_on_clock(&builder->tables, log(mass)) *
         pow(barrier, builder->tables.parameters.split_peak_slope);
}

/* A halo on its walk back in time. */
typedef struct {
  double log_mass;
  double clock;
} walker;

/* Where the drift of `from` brings it at a smaller mass. */
static double clock_after_drift(const ew_split_tables *t, const walker *from, double log_mass) {
  return from->clock + ew_table_at(&t->drift, from->log_mass) - ew_table_at(&t->drift, log_mass);
}

/* Relative error at the middle of a straight line in (redshift, mass) between two points of one drift. */
static double chord_error(const ew_split_tables *t, const walker *from, double log_mass) {
  double middle = 0.5 * (from->log_mass + log_mass);
  double z0 = ew_table_at(&t->redshift, from->clock);
  double z1 = ew_table_at(&t->redshift, clock_after_drift(t, from, log_mass));
  double z = ew_table_at(&t->redshift, clock_after_drift(t, from, middle));
  double m0 = exp(from->log_mass - middle), m1 = exp(log_mass - middle);
  return z1 > z0 ? fabs(m0 + (m1 - m0) * (z - z0) / (z1 - z0) - 1.0) : 0.0;
}

/* The next node on the way to `goal`: all the way if a straight line is good enough. */
static double next_node_mass(const ew_split_tables *t, const walker *from, double goal) {
  double stride = fmin(from->log_mass - goal, LONGEST_STRIDE);
  if (stride <= SHORTEST_STRIDE)
    return goal;
  while (stride > SHORTEST_STRIDE && chord_error(t, from, from->log_mass - stride) > NODE_PRECISION)
    stride *= 0.5;
  return stride < from->log_mass - goal ? from->log_mass - stride : goal;
}

/* Follows the drift to `goal`, laying nodes on the way but none at the goal itself. */
static bool drift_to(const ew_split_tables *t, walker *halo, double goal, ew_tree_memory *memory) {
  for (;;) {
    double next = next_node_mass(t, halo, goal);
    halo->clock = clock_after_drift(t, halo, next);
    halo->log_mass = next;
    if (next <= goal)
      return true;
    if (!ew_tree_memory_add_node(memory, exp(next), ew_table_at(&t->redshift, halo->clock)))
      return false;
  }
}

/* ln of the mass at which the branch next splits, or the resolution if it never does. */
static double draw_split_mass(const ew_split_tables *t, const walker *halo, ew_stream *stream) {
  double left = ew_table_at(&t->hazard, halo->log_mass) - ew_draw_exponential(stream);
  if (!(left > 0.0))
    return t->log_resolution;
  return fmin(ew_table_at(&t->mass_of_hazard, log1p(left)), halo->log_mass);
}

/* ln q of the smaller part, by rejection under a power law of the table. */
static double draw_log_share(const ew_split_tables *t, double log_mass, ew_stream *stream) {
  double low = t->log_resolution - log_mass, high = -log(2.0);
  double slope = ew_table_at(&t->envelope_slope, log_mass), power = slope + 1.0;
  double envelope = ew_table_at(&t->log_envelope, log_mass);
  double at_low = exp(power * low), at_high = exp(power * high);
  double share = low;
  for (int attempt = 0; attempt < LARGEST_ATTEMPTS; attempt++) {
    double u = ew_draw_uniform(stream), v = ew_draw_uniform(stream);
    share = fabs(power) > 1e-8 ? log(at_low + u * (at_high - at_low)) / power : low + u * (high - low);
    if (v < exp(ew_log_split_density(t, log_mass, share) - slope * share - envelope))
      break;
  }
  return fmin(fmax(share, low), high);
}

/* Lays the two nodes of a merger, sends the smaller part to the stack, and goes on with the larger. */
static bool split(const ew_split_tables *t, walker *halo, uint64_t ordinal, ew_stream *stream, ew_tree_memory *memory) {
  double mass = exp(halo->log_mass), redshift = ew_table_at(&t->redshift, halo->clock);
  double smaller = fmax(mass * exp(draw_log_share(t, halo->log_mass, stream)), t->parameters.resolution_mass);
  double larger = mass - smaller;
  halo->log_mass = log(larger);
  return ew_tree_memory_add_node(memory, mass, redshift) &&
         ew_tree_memory_push(memory, smaller, halo->clock, redshift, ordinal) &&
         ew_tree_memory_add_node(memory, larger, redshift);
}

/* Where the walk must stop at the latest: the resolution, or the mass at the highest redshift followed. */
static double last_mass(const ew_split_tables *t, const walker *halo) {
  double left = ew_table_at(&t->drift, halo->log_mass) - (t->highest_clock - halo->clock);
  return left > 0.0 ? ew_table_at(&t->mass_of_drift, left) : t->log_resolution;
}

static bool end_branch(const ew_split_tables *t, walker *halo, double goal, ew_tree_memory *memory) {
  if (!drift_to(t, halo, goal, memory))
    return false;
  bool resolved = goal <= t->log_resolution;
  double mass = resolved ? t->parameters.resolution_mass : exp(goal);
  return ew_tree_memory_add_node(memory, mass, ew_table_at(&t->redshift, halo->clock));
}

static bool walk_branch(const ew_split_tables *t, walker halo, const ew_draws *draws, ew_tree_memory *memory) {
  uint64_t key = ew_tree_memory_branch_key(memory);
  if (halo.log_mass <= t->log_resolution || halo.clock >= t->highest_clock)
    return true;
  for (uint64_t ordinal = 0;; ordinal++) {
    ew_stream stream = ew_stream_open(draws, EW_PROCESS_ASSEMBLY, key, ordinal);
    double goal = draw_split_mass(t, &halo, &stream), last = last_mass(t, &halo);
    if (goal <= last)
      return end_branch(t, &halo, last, memory);
    if (!drift_to(t, &halo, goal, memory) || !split(t, &halo, ordinal, &stream, memory))
      return false;
  }
}

static ew_status refuse_root(const ew_tree_builder *builder, const ew_root *root, ew_error *error) {
  const ew_tree_parameters *p = &builder->tables.parameters;
  if (!(root->mass > p->resolution_mass && root->mass <= builder->largest_mass))
    return ew_fail(error, EW_REFUSED, "root %llu has %g Msun; allowed: above trees.resolution_mass = %g, up to %g Msun",
                   (unsigned long long)root->number, root->mass, p->resolution_mass, builder->largest_mass);
  if (!(root->redshift >= 0.0 && root->redshift < p->highest_redshift))
    return ew_fail(error, EW_REFUSED, "root %llu is at redshift %g; allowed: 0 up to trees.highest_redshift = %g",
                   (unsigned long long)root->number, root->redshift, p->highest_redshift);
  return EW_OK;
}

ew_status ew_tree_grow(const ew_tree_builder *builder, const ew_root *root, const ew_draws *draws,
                       ew_tree_memory *memory, ew_tree *tree, ew_error *error) {
  ew_status status = refuse_root(builder, root, error);
  if (status != EW_OK)
    return status;
  const ew_split_tables *t = &builder->tables;
  double clock = ew_clock_of_barrier(t, ew_barrier(builder->cosmology, root->redshift));
  bool room = ew_tree_memory_start(memory, root->mass, clock, root->redshift);
  ew_walk walk;
  while (room && ew_tree_memory_pop(memory, &walk))
    room = ew_tree_memory_open_branch(memory, &walk) &&
           walk_branch(t, (walker){log(walk.mass), walk.clock}, draws, memory);
  if (!room)
    return ew_fail_memory(error, "a merger tree");
  ew_tree_memory_finish(memory, root, tree);
  return EW_OK;
}
