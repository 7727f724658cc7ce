/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Grown trees as random draws: splits, smooth loss, waits and shares against the exact rates; progenitors near the root
 * against the analytic form; and trees against trees of finer resolution. Seeds are fixed, so the limits, four or more
 * standard deviations, are met once and for all. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>

#include <cmocka.h>

#include "forest.h"
#include "tree/rates.h"

static const double LARGEST_DEVIATION = 4.0; /* of a mean, in its standard deviations */

typedef struct {
  double count, sum, squares;
} sample;

static void add(sample *s, double value) {
  s->count += 1.0;
  s->sum += value;
  s->squares += value * value;
}

static double mean(const sample *s) {
  return s->sum / s->count;
}

static double mean_variance(const sample *s) {
  return (s->squares / s->count - mean(s) * mean(s)) / (s->count - 1.0);
}

/* The mean may be off by that relative bias and LARGEST_DEVIATION of its own scatter. */
static void assert_mean(const sample *s, double expected, double bias, const char *what, double at) {
  double allowed = bias * expected + LARGEST_DEVIATION * sqrt(mean_variance(s));
  if (!(fabs(mean(s) - expected) <= allowed))
    fail_msg("%s at %g: mean of %g is %.6g, expected %.6g; allowed off by %.2g", what, at, s->count, mean(s), expected,
             allowed);
}

/* ------------------------------------------------------------------------------------------ a short look at the root
 */

/* Smooth gain of the main branch. */
static double smooth_gain(const ew_tree *tree) {
  double sum = 0.0;
  for (size_t n = main_branch(tree)->first_node + 1; n < tree->node_count; n++)
    if (tree->redshift[n - 1] > tree->redshift[n])
      sum += tree->mass[n] - tree->mass[n - 1];
  return sum;
}

static size_t main_splits(const ew_tree *tree) {
  size_t count = 0;
  for (size_t i = 0; i + 1 < tree->branch_count; i++)
    count += (size_t)tree->branch[i].joins_branch == tree->branch_count - 1;
  return count;
}

/* Rates change as the halo shrinks on the way, by less than half a percent. */
static const double SHORT_BIAS = 0.005;

static void count_near_root(double mass, double resolution, double redshift, const split_coefficients coefficients) {
  ew_tree_parameters parameters = tree_parameters(resolution, coefficients);
  parameters.highest_redshift = redshift + 0.01;
  forest f = plant(&planck18, &parameters, mass);
  double from = ew_barrier(f.cosmology, redshift), to = ew_barrier(f.cosmology, redshift + 0.01);
  sample splits = {0}, smooth = {0};
  for (uint64_t i = 0; i < 100000; i++) {
    ew_tree tree = grow(&f, mass, redshift, i);
    add(&splits, (double)main_splits(&tree));
    add(&smooth, smooth_gain(&tree) / mass);
  }
  double middle = 0.5 * (from + to), rise = to - from;
  assert_mean(&splits, ew_split_rate(f.builder, mass, middle) * rise, SHORT_BIAS, "splits", mass);
  assert_mean(&smooth, ew_smooth_rate(f.builder, mass, middle) * rise, SHORT_BIAS, "smooth loss", mass);
  fell(&f);
}

static void test_rates_near_the_root(void **state) {
  (void)state;
  static const split_coefficients odd = {0.8, -0.5, -0.5};
  count_near_root(1e10, 1e7, 6.0, published);
  count_near_root(1e10, 1e7, 6.0, plain);
  count_near_root(1e12, 1e8, 10.0, published);
  count_near_root(1e9, 1e7, 5.5, odd);
}

/* -------------------------------------------------------------------------------------------------- waits and shares
 */

/* A halo between two splits: from the first node back to the second, where it split unless `splits` is false. */
typedef struct {
  double later_mass, later_redshift, earlier_mass, smaller_mass;
  bool splits;
} segment;

typedef void (*segment_visitor)(void *context, const segment *s);

/* All segments of a branch, latest first. */
static void visit_segments(const ew_tree *tree, const ew_branch *branch, segment_visitor visit, void *context) {
  size_t later = last_node(branch);
  for (size_t n = later; n > branch->first_node; n--)
    if (tree->redshift[n] == tree->redshift[n - 1]) {
      visit(context, &(segment){tree->mass[later], tree->redshift[later], tree->mass[n],
                                tree->mass[n] - tree->mass[n - 1], true});
      later = n - 1;
    }
  visit(context, &(segment){tree->mass[later], tree->redshift[later], tree->mass[branch->first_node], 0.0, false});
}

static void visit_trees(const forest *f, double mass, uint64_t trees, segment_visitor visit, void *context) {
  for (uint64_t number = 0; number < trees; number++) {
    ew_tree tree = grow(f, mass, 0.0, number);
    for (size_t i = 0; i < tree.branch_count; i++)
      visit_segments(&tree, &tree.branch[i], visit, context);
  }
}

typedef struct {
  const ew_split_tables *tables;
  law law;
  double resolution;
  double *number; /* uniform if all is well */
  size_t count, capacity;
  double expected, variance; /* number of splits */
} gathering;

static void keep_number(gathering *g, double number) {
  if (g->count == g->capacity) {
    g->capacity = g->capacity ? 2 * g->capacity : 4096;
    g->number = realloc(g->number, g->capacity * sizeof *g->number);
    assert_non_null(g->number);
  }
  g->number[g->count++] = number;
}

/* Expected splits of a halo until the highest redshift followed, if only the first counted. */
static double hazard_ahead(const ew_split_tables *t, const segment *s) {
  double log_mass = log(s->later_mass), time = t->highest_clock - ew_clock_of_redshift(t, s->later_redshift);
  double left = ew_table_at(&t->drift, log_mass) - time;
  double last = left > 0.0 ? ew_table_inverse(&t->drift, log_mass, left) : t->log_resolution;
  return ew_table_at(&t->hazard, log_mass) - ew_table_at(&t->hazard, last);
}

/* The wait until the split, as its probability among waits that end in one. */
static void gather_wait(void *context, const segment *s) {
  gathering *g = context;
  double some = -expm1(-hazard_ahead(g->tables, s));
  g->expected += some;
  g->variance += some * (1.0 - some);
  if (!s->splits)
    return;
  const ew_table *hazard = &g->tables->hazard;
  keep_number(g, -expm1(ew_table_at(hazard, log(s->earlier_mass)) - ew_table_at(hazard, log(s->later_mass))) / some);
}

static void check_waits(double mass, double resolution, const split_coefficients coefficients, uint64_t trees) {
  ew_error error = {0};
  ew_split_tables tables;
  ew_tree_parameters parameters = tree_parameters(resolution, coefficients);
  forest f = plant(&planck18, &parameters, mass);
  assert_int_equal(ew_split_tables_make(&tables, f.spectrum, &parameters, mass, &error), EW_OK);
  gathering g = {.tables = &tables};
  visit_trees(&f, mass, trees, gather_wait, &g);
  if (!(fabs((double)g.count - g.expected) <= LARGEST_DEVIATION * sqrt(g.variance)))
    fail_msg("%zu splits, expected %.1f +- %.1f", g.count, g.expected, sqrt(g.variance));
  assert_uniform(g.number, g.count, "waits");
  free(g.number);
  ew_split_tables_clear(&tables);
  fell(&f);
}

/* Waits are exponential in the hazard along the drift, in dwarfs as in haloes that split after 1e-6 of their mass. */
static void test_waits(void **state) {
  (void)state;
  check_waits(1e10, 1e7, published, 300);
  check_waits(1e10, 1e6, plain, 30);
  check_waits(1e12, 1e6, published, 3);
  check_waits(3e11, 1e5, published, 1);
}

/* Simpson's rule over the split density, in strides short against the ln 2 on which it bends. */
static double splits_between(const law *l, double from, double to) {
  int strides = 2 * (int)ceil((to - from) / 0.2);
  double width = (to - from) / strides, sum = law_density(l, from) + law_density(l, to);
  for (int i = 1; i < strides; i++)
    sum += (i % 2 ? 4.0 : 2.0) * law_density(l, from + width * i);
  return to > from ? sum * width / 3.0 : 0.0;
}

/* The share of the smaller part, as its probability among shares above the resolution. */
static void gather_share(void *context, const segment *s) {
  gathering *g = context;
  if (!s->splits)
    return;
  g->law.mass = s->earlier_mass;
  double low = log(g->resolution / s->earlier_mass), share = log(s->smaller_mass / s->earlier_mass);
  double below = splits_between(&g->law, low, share), above = splits_between(&g->law, share, -log(2.0));
  keep_number(g, below / (below + above));
}

static void check_shares(double mass, double resolution, const split_coefficients coefficients, uint64_t trees) {
  ew_tree_parameters parameters = tree_parameters(resolution, coefficients);
  forest f = plant(&planck18, &parameters, mass);
  gathering g = {.law = {f.spectrum, coefficients, mass}, .resolution = resolution};
  visit_trees(&f, mass, trees, gather_share, &g);
  if (g.count < 8000)
    fail_msg("only %zu splits to look at", g.count);
  assert_uniform(g.number, g.count, "shares");
  free(g.number);
  fell(&f);
}

static void test_shares(void **state) {
  (void)state;
  check_shares(1e10, 1e7, published, 150);
  check_shares(1e11, 1e7, plain, 15);
  check_shares(1e9, 1e6, (split_coefficients){0.6, 0.9, 0.5}, 400);
  check_shares(1e9, 1e6, (split_coefficients){0.8, -0.5, -0.5}, 150);
}

/* -----------------------------------------------------------------------------------------------------------
 * progenitors */

static bool alive(const ew_tree *tree, const ew_branch *branch, double redshift) {
  return tree->redshift[branch->first_node] >= redshift &&
         (branch->joins_branch < 0 || tree->redshift[last_node(branch)] < redshift);
}

static double progenitors_between(const ew_tree *tree, double redshift, double low, double high) {
  double count = 0.0;
  for (size_t i = 0; i < tree->branch_count; i++)
    if (alive(tree, &tree->branch[i], redshift)) {
      double mass = ew_branch_mass(tree, &tree->branch[i], redshift);
      count += mass >= low && mass < high;
    }
  return count;
}

static double expected_between(const ew_spectrum *spectrum, const ew_progenitor_question *q, double low, double high) {
  enum { STRIDES = 64 };
  double width = log(high / low) / STRIDES, sum = 0.0;
  for (int i = 0; i < STRIDES; i++)
    sum += width * ew_progenitor_number(spectrum, q, low * exp(width * (i + 0.5)));
  return sum;
}

/* The analytic form is not what binary splits can keep up far from the root or from a tenth of its mass on, where it
 * expects another number of halves left and right of the middle. Over so short a time, nearer than a per cent. */
static const double ANALYTIC_BIAS = 0.01;

/* Plain trees shortly before the root: number of progenitors in bins of a factor four from three resolutions up. */
static void check_analytic_form(double mass, double resolution) {
  enum { BINS = 4, TREES = 100000 };
  const double redshift = 5.95, rise = 0.05;
  ew_tree_parameters parameters = tree_parameters(resolution, plain);
  parameters.highest_redshift = redshift + 1.1 * rise;
  forest f = plant(&planck18, &parameters, mass);
  ew_progenitor_question q = {.mass = mass, .redshift = redshift, .earlier = redshift + rise};
  sample number[BINS] = {{0}};
  for (uint64_t i = 0; i < TREES; i++) {
    ew_tree tree = grow(&f, mass, redshift, i);
    for (int k = 0; k < BINS; k++)
      add(&number[k],
          progenitors_between(&tree, q.earlier, 3.0 * resolution * pow(4.0, k), 3.0 * resolution * pow(4.0, k + 1)));
  }
  for (int k = 0; k < BINS; k++) {
    double low = 3.0 * resolution * pow(4.0, k);
    assert_mean(&number[k], expected_between(f.spectrum, &q, low, 4.0 * low), ANALYTIC_BIAS, "progenitors", low);
  }
  fell(&f);
}

static void test_progenitors_near_the_root(void **state) {
  (void)state;
  check_analytic_form(1e12, 1e8);
  check_analytic_form(1e10, 1e6);
}

/* What is looked at in trees of two resolutions. */
enum { LOOK_REDSHIFTS = 3, LOOK_BINS = 2, LOOK_SHARES = 2 };
static const double look_redshift[LOOK_REDSHIFTS] = {1.0, 3.0, 6.0}, look_share[LOOK_SHARES] = {0.5, 0.1};
static const double look_mass[LOOK_BINS + 1] = {3e7, 1e8, 1e11};
/* Small haloes drift below the resolution, which costs progenitors of 3 to 10 times its mass up to 2 per cent, and a
 * few in a thousand above: a property of the algorithm. */
static const double look_bias[LOOK_BINS] = {0.03, 0.01};

typedef struct {
  sample progenitors[LOOK_REDSHIFTS][LOOK_BINS];
  sample formation[LOOK_SHARES]; /* ln(1 + z) */
} forest_look;

static void look_at_tree(forest_look *look, const ew_tree *tree) {
  for (int z = 0; z < LOOK_REDSHIFTS; z++)
    for (int k = 0; k < LOOK_BINS; k++)
      add(&look->progenitors[z][k], progenitors_between(tree, look_redshift[z], look_mass[k], look_mass[k + 1]));
  for (int k = 0; k < LOOK_SHARES; k++)
    add(&look->formation[k], log1p(ew_formation_redshift(tree, main_branch(tree), look_share[k])));
}

static void look_at_forest(forest_look *look, double resolution, uint64_t trees, uint64_t first) {
  ew_tree_parameters parameters = tree_parameters(resolution, published);
  forest f = plant(&planck18, &parameters, 1e10);
  for (uint64_t i = 0; i < trees; i++) {
    ew_tree tree = grow(&f, 1e10, 0.0, first + i);
    look_at_tree(look, &tree);
  }
  fell(&f);
}

static void assert_same_mean(const sample *coarse, const sample *fine, double bias, const char *what, double at) {
  double allowed = bias * mean(fine) + LARGEST_DEVIATION * sqrt(mean_variance(coarse) + mean_variance(fine));
  if (!(fabs(mean(coarse) - mean(fine)) <= allowed))
    fail_msg("%s at %g: %.6g in coarse trees, %.6g in fine ones; allowed to differ by %.2g", what, at, mean(coarse),
             mean(fine), allowed);
}

static void test_independence_of_resolution(void **state) {
  (void)state;
  forest_look coarse = {0}, fine = {0};
  look_at_forest(&coarse, 1e7, 20000, 0);
  look_at_forest(&fine, 1e6, 6000, 100000);
  for (int z = 0; z < LOOK_REDSHIFTS; z++)
    for (int k = 0; k < LOOK_BINS; k++)
      assert_same_mean(&coarse.progenitors[z][k], &fine.progenitors[z][k], look_bias[k], "progenitors",
                       look_redshift[z]);
  for (int k = 0; k < LOOK_SHARES; k++)
    assert_same_mean(&coarse.formation[k], &fine.formation[k], 0.0, "formation", look_share[k]);
}

int main(void) {
  ew_core_start();
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(test_rates_near_the_root),
      cmocka_unit_test(test_waits),
      cmocka_unit_test(test_shares),
      cmocka_unit_test(test_progenitors_near_the_root),
      cmocka_unit_test(test_independence_of_resolution),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
