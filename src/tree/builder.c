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

#define NODE_PRECISION   0.0065 /* relative error half-way between nodes: up to 1.5 times that elsewhere between */
#define LONGEST_STRIDE   0.22   /* of ln M between nodes: an exponential is then 0.006 off a straight line */
#define SHORTEST_STRIDE  0.03   /* even the plunge onto the resolution is within 0.005 of a straight line over this */
#define MASS_ROUNDING    1e-14  /* of a mass by way of its logarithm */
#define LARGEST_ATTEMPTS 1000   /* of the rejection, which accepts about every second share */

struct ew_tree_builder {
  ew_split_tables tables;
  double largest_mass;
};

ew_status ew_tree_builder_new(ew_tree_builder **builder, const ew_spectrum *spectrum,
                              const ew_tree_parameters *parameters, double largest_mass, ew_error *error) {
  *builder = NULL;
  ew_status status = ew_rows_check(ew_tree_rows, parameters, error);
  if (status != EW_OK)
    return status;
  if (!(largest_mass <= EW_HIGHEST_MASS))
    return ew_fail(error, EW_REFUSED, "roots of %g Msun are outside the table of sigma(M); allowed: up to %g Msun",
                   largest_mass, EW_HIGHEST_MASS);
  if (!(parameters->resolution_mass < largest_mass))
    return ew_fail(error, EW_REFUSED,
                   "trees.resolution_mass = %g Msun leaves nothing to grow; allowed: below the largest root, %g Msun",
                   parameters->resolution_mass, largest_mass);
  ew_tree_builder *fresh = calloc(1, sizeof *fresh);
  if (!fresh)
    return ew_fail_memory(error, "the tree builder");
  fresh->largest_mass = largest_mass;
  status = ew_split_tables_make(&fresh->tables, spectrum, parameters, largest_mass, error);
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
  double drift; /* T of that mass */
  double clock;
  double redshift;
} walker;

/* The halo when smooth loss has brought it down to that mass. No rounding may make its redshift fall on the way, or
 * pass the highest followed. */
static walker drifted(const ew_split_tables *t, const walker *from, double log_mass) {
  double drift = ew_table_at(&t->drift, log_mass), clock = from->clock + (from->drift - drift);
  double redshift = fmin(ew_table_at(&t->redshift, clock), t->parameters.highest_redshift);
  return (walker){log_mass, drift, clock, fmax(redshift, from->redshift)};
}

/* Relative error of a straight line in (redshift, mass) half-way between two nodes of one drift. */
static double chord_error(const ew_split_tables *t, const walker *from, const walker *to) {
  if (!(to->redshift > from->redshift))
    return 0.0;
  walker middle = drifted(t, from, 0.5 * (from->log_mass + to->log_mass));
  double part = (middle.redshift - from->redshift) / (to->redshift - from->redshift);
  double from_mass = exp(from->log_mass - middle.log_mass), to_mass = 1.0 / from_mass;
  return fabs(from_mass + (to_mass - from_mass) * part - 1.0);
}

/* The next node on the way to `goal`: the goal itself if a straight line is good enough. */
static walker next_node(const ew_split_tables *t, const walker *from, double goal) {
  double left = from->log_mass - goal, stride = fmin(left, LONGEST_STRIDE);
  for (;; stride *= 0.5) {
    walker next = drifted(t, from, stride < left ? from->log_mass - stride : goal);
    if (stride <= SHORTEST_STRIDE || chord_error(t, from, &next) <= NODE_PRECISION)
      return next;
  }
}

/* Follows the drift to `goal`, laying nodes on the way but none at the goal itself. */
static bool drift_to(const ew_split_tables *t, walker *halo, double goal, ew_tree_memory *memory) {
  for (;;) {
    *halo = next_node(t, halo, goal);
    if (halo->log_mass <= goal)
      return true;
    if (!ew_tree_memory_add_node(memory, exp(halo->log_mass), halo->redshift))
      return false;
  }
}

/* ln of the mass at which the branch next splits, or the resolution if it never does. */
static double draw_split_mass(const ew_split_tables *t, const walker *halo, ew_stream *stream) {
  double lightest = t->log_resolution + log(2.0); /* that can split into two above the resolution */
  if (!(halo->log_mass > lightest))
    return t->log_resolution;
  double left = ew_table_at(&t->hazard, halo->log_mass) - ew_draw_exponential(stream);
  return left > 0.0 ? fmax(ew_table_inverse(&t->hazard, halo->log_mass, left), lightest) : t->log_resolution;
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

/* Mass of a part, which is at the resolution if rounding hides by how much it is above. */
static double part_mass(const ew_split_tables *t, double mass) {
  double resolution = t->parameters.resolution_mass;
  return mass > resolution * (1.0 + MASS_ROUNDING) ? mass : resolution;
}

/* Lays the two nodes of a merger, sends the smaller part to the stack, and goes on with the larger. */
static bool split(const ew_split_tables *t, walker *halo, uint64_t ordinal, ew_stream *stream, ew_tree_memory *memory) {
  double mass = exp(halo->log_mass);
  double smaller = part_mass(t, mass * exp(draw_log_share(t, halo->log_mass, stream)));
  double larger = part_mass(t, mass - smaller);
  halo->log_mass = log(larger);
  halo->drift = ew_table_at(&t->drift, halo->log_mass);
  return ew_tree_memory_add_node(memory, mass, halo->redshift) &&
         ew_tree_memory_push(memory, smaller, halo->clock, halo->redshift, ordinal) &&
         ew_tree_memory_add_node(memory, larger, halo->redshift);
}

static bool end_at_resolution(const ew_split_tables *t, walker *halo, ew_tree_memory *memory) {
  return drift_to(t, halo, t->log_resolution, memory) &&
         ew_tree_memory_add_node(memory, t->parameters.resolution_mass, halo->redshift);
}

static bool end_at_highest_redshift(const ew_split_tables *t, walker *halo, ew_tree_memory *memory) {
  double left = halo->drift - (t->highest_clock - halo->clock);
  double goal = ew_table_inverse(&t->drift, halo->log_mass, left);
  return drift_to(t, halo, goal, memory) && ew_tree_memory_add_node(memory, exp(goal), t->parameters.highest_redshift);
}

static bool walk_branch(const ew_split_tables *t, const ew_walk *walk, const ew_draws *draws, ew_tree_memory *memory) {
  double log_mass = log(walk->mass);
  walker halo = {log_mass, ew_table_at(&t->drift, log_mass), walk->clock, walk->redshift};
  for (uint64_t ordinal = 0; halo.log_mass > t->log_resolution && halo.clock < t->highest_clock; ordinal++) {
    ew_stream stream = ew_stream_open(draws, EW_PROCESS_ASSEMBLY, walk->key, ordinal);
    double goal = draw_split_mass(t, &halo, &stream);
    if (drifted(t, &halo, goal).clock >= t->highest_clock)
      return end_at_highest_redshift(t, &halo, memory);
    if (goal <= t->log_resolution)
      return end_at_resolution(t, &halo, memory);
    if (!drift_to(t, &halo, goal, memory) || !split(t, &halo, ordinal, &stream, memory))
      return false;
  }
  return true;
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
  bool room = ew_tree_memory_start(memory, root->mass, ew_clock_of_redshift(t, root->redshift), root->redshift);
  ew_walk walk;
  while (room && ew_tree_memory_pop(memory, &walk))
    room = ew_tree_memory_open_branch(memory, &walk) && walk_branch(t, &walk, draws, memory);
  if (!room)
    return ew_fail(error, EW_FAILED,
                   "no room for the tree of root %llu, %g Msun; a higher trees.resolution_mass needs less",
                   (unsigned long long)root->number, root->mass);
  ew_tree_memory_finish(memory, root, tree);
  return EW_OK;
}
