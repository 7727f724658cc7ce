/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What every grown tree must be - its order, its books, its nodes, its keys - over thousands of random roots; what it
 * may depend on; and which requests are refused. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>

#include <cmocka.h>

#include "forest.h"
#include "tree/rates.h"

#include <string.h>

/* One subtraction. */
static const double MERGER_TOLERANCE = 1e-14;
/* A sum over all nodes. */
static const double TOTAL_TOLERANCE = 1e-11;
/* What tree.h promises of straight lines between nodes. */
static const double NODE_TOLERANCE = 0.01;
/* Of 1 + z, by straight lines of a table over the clock: 2e-6 in universes like ours; this where the clock goes as the
 * barrier to the 1.5 and matter is sparse. */
static const double CLOCK_TOLERANCE = 2e-4;

static double uniform(const char *what, uint64_t number) {
  ew_draws draws = {.seed = (uint64_t)what[0], .tree = number};
  ew_stream stream = ew_stream_open(&draws, EW_PROCESS_ROOTS, 0, 0);
  return ew_draw_uniform(&stream);
}

/* ---------------------------------------------------------------------------------------------------------- structure
 */

static void check_ends(const ew_tree *tree, const ew_tree_parameters *p, const ew_root *root) {
  for (size_t i = 0; i < tree->branch_count; i++) {
    double mass = tree->mass[tree->branch[i].first_node], redshift = tree->redshift[tree->branch[i].first_node];
    if (mass != p->resolution_mass && redshift != p->highest_redshift)
      fail_msg("tree %llu, branch %zu starts with %.17g Msun at z = %.17g", (unsigned long long)tree->number, i, mass,
               redshift);
  }
  assert_true(tree->mass[tree->node_count - 1] == root->mass);
  assert_true(tree->redshift[tree->node_count - 1] == root->redshift);
}

/* Nothing is lost on the way to the root: masses never fall, and what is no join is smooth. */
static void check_books(const ew_tree *tree, const ew_tree_parameters *p) {
  double first = 0.0, smooth = 0.0;
  size_t pairs = 0;
  for (size_t i = 0; i < tree->branch_count; i++) {
    size_t low = tree->branch[i].first_node, high = last_node(&tree->branch[i]);
    first += tree->mass[low];
    for (size_t n = low + 1; n <= high; n++) {
      double gain = tree->mass[n] - tree->mass[n - 1];
      bool pair = tree->redshift[n] == tree->redshift[n - 1];
      assert_true(gain >= 0.0);
      assert_true(tree->mass[n] >= p->resolution_mass && tree->redshift[n - 1] <= p->highest_redshift);
      pairs += pair;
      smooth += pair ? 0.0 : gain;
    }
  }
  assert_int_equal(pairs, tree->branch_count - 1);
  assert_close(first + smooth, tree->mass[tree->node_count - 1], TOTAL_TOLERANCE, "first nodes and smooth mass", 0.0);
}

static void check_mergers(const ew_tree *tree) {
  for (size_t i = 0; i + 1 < tree->branch_count; i++) {
    const ew_branch *b = &tree->branch[i];
    double satellite = tree->mass[last_node(b)], before = tree->mass[b->joins_node - 1];
    double after = tree->mass[b->joins_node];
    assert_close(before + satellite, after, MERGER_TOLERANCE, "mass after a merger", after);
    assert_true(satellite <= before * (1.0 + MERGER_TOLERANCE));
    assert_true(tree->redshift[last_node(b)] == tree->redshift[b->joins_node]);
    assert_true(tree->redshift[b->joins_node - 1] == tree->redshift[b->joins_node]);
  }
}

static int compare_keys(const void *a, const void *b) {
  uint64_t x = *(const uint64_t *)a, y = *(const uint64_t *)b;
  return (x > y) - (x < y);
}

/* Splits are counted from the root back in time, and what splits off last in time stands first in the tree. */
static void check_keys(const ew_tree *tree) {
  uint64_t *key = calloc(tree->branch_count, sizeof *key), *splits = calloc(tree->branch_count, sizeof *splits);
  assert_non_null(key);
  assert_non_null(splits);
  assert_true(main_branch(tree)->key == ew_branch_key_root());
  for (size_t i = 0; i < tree->branch_count; i++) {
    const ew_branch *b = &tree->branch[i];
    key[i] = b->key;
    if (b->joins_branch >= 0)
      assert_true(b->key == ew_branch_key_child(tree->branch[b->joins_branch].key, splits[b->joins_branch]++));
  }
  qsort(key, tree->branch_count, sizeof *key, compare_keys);
  for (size_t i = 1; i < tree->branch_count; i++)
    assert_true(key[i] != key[i - 1]);
  free(key);
  free(splits);
}

static void check_stretch(const ew_tree *tree, const ew_split_tables *t, const ew_cosmology *cosmology, size_t node) {
  double z0 = tree->redshift[node + 1], z1 = tree->redshift[node], m0 = tree->mass[node + 1], m1 = tree->mass[node];
  double clock0 = ew_clock_of_barrier(t, ew_barrier(cosmology, z0)), drift0 = ew_table_at(&t->drift, log(m0));
  for (int k = 1; k <= 8; k++) {
    double mass = m0 * pow(m1 / m0, k / 8.0), clock = clock0 + drift0 - ew_table_at(&t->drift, log(mass));
    double z = ew_redshift_of_barrier(cosmology, ew_barrier_of_clock(t, clock));
    assert_close(m0 + (m1 - m0) * (z - z0) / (z1 - z0), mass, NODE_TOLERANCE, "straight mass", z);
    if (k == 8 && fabs(z - z1) > CLOCK_TOLERANCE * (1.0 + z))
      fail_msg("smooth loss from %.12g at z = %.12g to %.12g ends at z = %.12g, expected %.12g", m0, z0, m1, z1, z);
  }
}

/* Between nodes the mass follows the drift of the exact rates: at the nodes by the clock, between them within a
 * percent. */
static void check_drift(const ew_tree *tree, const ew_split_tables *tables, const ew_cosmology *cosmology) {
  for (size_t i = 0; i < tree->branch_count; i++)
    for (size_t n = tree->branch[i].first_node; n < last_node(&tree->branch[i]); n++)
      if (tree->redshift[n] > tree->redshift[n + 1] + 1e-3)
        check_stretch(tree, tables, cosmology, n);
}

enum { ROOTS_EACH = 130, DRIFTS_EACH = 12 };

/* Roots from just above the resolution to 1e5 times it, at redshifts 0 to 10. */
static ew_root random_root(const ew_tree_parameters *p, uint64_t number) {
  double ratio = pow(10.0, 5.0 * uniform("mass", number));
  return (ew_root){.number = number,
                   .mass = p->resolution_mass * fmax(ratio, 1.0 + 1e-9),
                   .redshift = number % 3 == 0 ? 0.0 : 10.0 * uniform("redshift", number)};
}

static void check_grove(const ew_cosmology_parameters *universe, const ew_tree_parameters *parameters, uint64_t from) {
  ew_error error = {0};
  ew_split_tables tables;
  double largest = 1e5 * parameters->resolution_mass;
  forest f = plant(universe, parameters, largest);
  assert_int_equal(ew_split_tables_make(&tables, f.spectrum, parameters, largest, &error), EW_OK);
  for (uint64_t number = from; number < from + ROOTS_EACH; number++) {
    ew_root root = random_root(parameters, number);
    ew_tree tree = grow(&f, root.mass, root.redshift, number);
    check_ends(&tree, parameters, &root);
    check_books(&tree, parameters);
    check_mergers(&tree);
    check_keys(&tree);
    if (number < from + DRIFTS_EACH)
      check_drift(&tree, &tables, f.cosmology);
  }
  ew_split_tables_clear(&tables);
  fell(&f);
}

static void test_structure_of_random_trees(void **state) {
  (void)state;
  static const double resolutions[] = {1e4, 1e6, 1e8, 1e10};
  for (size_t u = 0; u < ODD_UNIVERSES; u++)
    for (size_t k = 0; k < ODD_COEFFICIENTS; k++) {
      ew_cosmology_parameters universe = odd_universe(u);
      ew_tree_parameters parameters = tree_parameters(resolutions[(u + k) % 4], odd_coefficients[k]);
      if (k % 2)
        parameters.highest_redshift = 12.0;
      check_grove(&universe, &parameters, 1000 * (u * ODD_COEFFICIENTS + k));
    }
}

/* The smallest trees: nothing to split, no time, or both. */
static void test_smallest_trees(void **state) {
  (void)state;
  ew_tree_parameters parameters = tree_parameters(1e7, published);
  forest f = plant(&planck18, &parameters, 1e12);
  static const double masses[] = {1e7 * (1.0 + 1e-15), 1.0001e7, 1.99999e7, 2e7, 2.00001e7, 1e12};
  static const double redshifts[] = {0.0, 1e-12, 39.9, 40.0 - 1e-9, 40.0 - 1e-14};
  for (size_t m = 0; m < sizeof masses / sizeof *masses; m++)
    for (size_t z = 0; z < sizeof redshifts / sizeof *redshifts; z++) {
      if (masses[m] == 1e12 && z < 2)
        continue;
      ew_tree tree = grow(&f, masses[m], redshifts[z], 1);
      check_mergers(&tree);
      check_keys(&tree);
      assert_true(tree.mass[tree.node_count - 1] == masses[m]);
      assert_true(tree.redshift[0] <= 40.0);
    }
  fell(&f);
}

/* A halo of a hair less than twice the resolution never splits, though the table of the hazard rounds that corner and
 * holds 1.4e-6 there: three of these draws are below. */
static void test_too_light_to_split(void **state) {
  (void)state;
  ew_tree_parameters parameters = tree_parameters(1e7, published);
  forest f = plant(&planck18, &parameters, 3e7);
  for (uint64_t number = 3000000; number < 3500000; number++) {
    ew_error error = {0};
    ew_tree tree;
    ew_root root = {.number = number, .mass = 1.99999e7};
    assert_int_equal(ew_tree_grow(f.builder, &root, &(ew_draws){.tree = number}, f.memory, &tree, &error), EW_OK);
    assert_int_equal(tree.branch_count, 1);
  }
  fell(&f);
}

/* ------------------------------------------------------------------------------------------------------------ streams
 */

typedef struct {
  ew_tree tree;
  ew_branch *branch;
  double *mass, *redshift;
} copy;

static void *copy_of(const void *array, size_t size) {
  void *kept = malloc(size);
  assert_non_null(kept);
  return memcpy(kept, array, size);
}

static copy keep(const ew_tree *tree) {
  copy c = {.tree = *tree,
            .branch = copy_of(tree->branch, tree->branch_count * sizeof *tree->branch),
            .mass = copy_of(tree->mass, tree->node_count * sizeof *tree->mass),
            .redshift = copy_of(tree->redshift, tree->node_count * sizeof *tree->redshift)};
  c.tree.branch = c.branch;
  c.tree.mass = c.mass;
  c.tree.redshift = c.redshift;
  return c;
}

static void drop(copy *c) {
  free(c->branch);
  free(c->mass);
  free(c->redshift);
}

static bool same_branches(const ew_tree *a, const ew_tree *b) {
  for (size_t i = 0; i < a->branch_count; i++) {
    const ew_branch *x = &a->branch[i], *y = &b->branch[i];
    if (x->key != y->key || x->first_node != y->first_node || x->node_count != y->node_count ||
        x->joins_branch != y->joins_branch || x->joins_node != y->joins_node)
      return false;
  }
  return true;
}

static bool same(const ew_tree *a, const ew_tree *b) {
  return a->branch_count == b->branch_count && a->node_count == b->node_count && same_branches(a, b) &&
         memcmp(a->mass, b->mass, a->node_count * sizeof *a->mass) == 0 &&
         memcmp(a->redshift, b->redshift, a->node_count * sizeof *a->redshift) == 0;
}

static ew_tree grow_with(const forest *f, ew_draws draws) {
  ew_error error = {0};
  ew_tree tree;
  ew_root root = {.number = draws.tree, .halo_id = -7, .weight = 2.385, .mass = 1e10};
  assert_int_equal(ew_tree_grow(f->builder, &root, &draws, f->memory, &tree, &error), EW_OK);
  return tree;
}

static void test_draws_make_the_tree(void **state) {
  (void)state;
  ew_tree_parameters parameters = tree_parameters(1e7, published);
  forest f = plant(&planck18, &parameters, 1e10);
  ew_draws draws = {.seed = 3, .tree = 5}, other = draws;
  ew_tree tree = grow_with(&f, draws);
  assert_true(tree.number == 5 && tree.halo_id == -7 && tree.weight == 2.385);
  copy kept = keep(&tree);
  tree = grow_with(&f, draws);
  assert_true(same(&tree, &kept.tree));
  other.realization[EW_PROCESS_STRUCTURE] = other.realization[EW_PROCESS_ROOTS] = 1;
  tree = grow_with(&f, other);
  assert_true(same(&tree, &kept.tree));
  for (int i = 0; i < 3; i++) {
    other = draws;
    *(uint64_t *[]){&other.seed, &other.tree, &other.realization[EW_PROCESS_ASSEMBLY]}[i] += 1;
    tree = grow_with(&f, other);
    assert_false(same(&tree, &kept.tree));
  }
  drop(&kept);
  fell(&f);
}

/* A tree is the same whatever was grown before it, in whatever memory, and however massive other roots may be. */
static void test_nothing_else_makes_the_tree(void **state) {
  (void)state;
  ew_tree_parameters parameters = tree_parameters(1e7, published);
  forest small = plant(&planck18, &parameters, 1e10), large = plant(&planck18, &parameters, 3e12);
  for (uint64_t number = 0; number < 100; number++) {
    ew_tree fresh = grow(&small, 1e10, 0.0, number);
    copy kept = keep(&fresh);
    grow(&large, number % 10 ? 1e8 : 1e12, 0.0, number + 1);
    ew_tree tree = grow(&large, 1e10, 0.0, number);
    assert_true(same(&tree, &kept.tree));
    drop(&kept);
  }
  fell(&small);
  fell(&large);
}

/* Refused growth leaves the memory fit for the next tree. */
static void test_refusal_spoils_nothing(void **state) {
  (void)state;
  ew_tree_parameters parameters = tree_parameters(1e7, published);
  forest f = plant(&planck18, &parameters, 1e10);
  ew_tree tree = grow(&f, 1e10, 0.0, 4);
  copy kept = keep(&tree);
  ew_error error = {0};
  ew_root root = {.mass = 1e6};
  assert_int_equal(ew_tree_grow(f.builder, &root, &(ew_draws){0}, f.memory, &tree, &error), EW_REFUSED);
  tree = grow(&f, 1e10, 0.0, 4);
  assert_true(same(&tree, &kept.tree));
  drop(&kept);
  fell(&f);
}

static bool joined_before(const ew_tree *tree, size_t branch, double redshift) {
  return tree->redshift[last_node(&tree->branch[branch])] < redshift;
}

/* Nodes of a branch from its last down to those of its earliest merger. */
static size_t nodes_to_earliest_merger(const ew_tree *tree, const ew_branch *branch) {
  size_t node = branch->first_node;
  while (node < last_node(branch) && tree->redshift[node] > tree->redshift[node + 1])
    node++;
  return last_node(branch) - node + 1;
}

static void compare_cut_branch(const ew_tree *shorter, const ew_branch *a, const ew_tree *longer, const ew_branch *b) {
  size_t count = nodes_to_earliest_merger(shorter, a);
  assert_true(a->key == b->key && count <= b->node_count);
  for (size_t n = 0; n < count; n++) {
    assert_true(shorter->mass[last_node(a) - n] == longer->mass[last_node(b) - n]);
    assert_true(shorter->redshift[last_node(a) - n] == longer->redshift[last_node(b) - n]);
  }
  double cut = shorter->redshift[a->first_node], mass = shorter->mass[a->first_node];
  assert_close(ew_branch_mass(longer, b, cut), mass, NODE_TOLERANCE, "mass at the cut", cut);
}

static void compare_until(const ew_tree *shorter, const ew_tree *longer, double redshift) {
  size_t i = 0;
  for (size_t k = 0; k < longer->branch_count; k++)
    if (joined_before(longer, k, redshift)) {
      assert_true(i < shorter->branch_count);
      compare_cut_branch(shorter, &shorter->branch[i++], longer, &longer->branch[k]);
    }
  assert_int_equal(i, shorter->branch_count);
}

/* Followed to a lower redshift, a tree is cut there; its mergers and what is later than them are the same to the last
 * bit. Nodes of the stretches that are cut may stand elsewhere on the same line. */
static void test_highest_redshift_only_cuts(void **state) {
  (void)state;
  ew_tree_parameters parameters = tree_parameters(1e7, published);
  forest longer = plant(&planck18, &parameters, 1e11);
  parameters.highest_redshift = 6.0;
  forest shorter = plant(&planck18, &parameters, 1e11);
  for (uint64_t number = 0; number < 30; number++) {
    ew_tree a = grow(&shorter, 1e11, 0.0, number), b = grow(&longer, 1e11, 0.0, number);
    assert_true(a.branch_count < b.branch_count);
    compare_until(&a, &b, 6.0);
  }
  fell(&shorter);
  fell(&longer);
}

/* ----------------------------------------------------------------------------------------------------------- refusals
 */

static void assert_one_line(const ew_error *error, const char *part) {
  assert_int_equal(error->status, EW_REFUSED);
  assert_null(strchr(error->message, '\n'));
  if (!strstr(error->message, part))
    fail_msg("\"%s\" does not say \"%s\"", error->message, part);
}

static void test_refused_roots(void **state) {
  (void)state;
  static const struct {
    double mass, redshift;
    const char *part;
  } refused[] = {
      {1e7, 0.0, "root 12 has 1e+07 Msun"},
      {9.9e6, 0.0, "above trees.resolution_mass = 1e+07"},
      {-1e9, 0.0, "Msun"},
      {1.0001e10, 0.0, "up to 1e+10 Msun"},
      {NAN, 0.0, "Msun"},
      {INFINITY, 0.0, "Msun"},
      {1e9, -0.001, "redshift -0.001"},
      {1e9, 40.0, "trees.highest_redshift = 40"},
      {1e9, 41.0, "redshift 41"},
      {1e9, NAN, "redshift"},
  };
  ew_tree_parameters parameters = tree_parameters(1e7, published);
  forest f = plant(&planck18, &parameters, 1e10);
  for (size_t i = 0; i < sizeof refused / sizeof *refused; i++) {
    ew_error error = {0};
    ew_tree tree;
    ew_root root = {.number = 12, .mass = refused[i].mass, .redshift = refused[i].redshift};
    assert_int_equal(ew_tree_grow(f.builder, &root, &(ew_draws){0}, f.memory, &tree, &error), EW_REFUSED);
    assert_one_line(&error, refused[i].part);
  }
  fell(&f);
}

static void refuse_builder(const ew_spectrum *spectrum, ew_tree_parameters parameters, double largest_mass,
                           const char *part) {
  ew_error error = {0};
  ew_tree_builder *builder;
  assert_int_equal(ew_tree_builder_new(&builder, spectrum, &parameters, largest_mass, &error), EW_REFUSED);
  assert_null(builder);
  assert_one_line(&error, part);
}

static void test_refused_builders(void **state) {
  (void)state;
  ew_tree_parameters good = tree_parameters(1e7, published);
  forest f = plant(&planck18, &good, 1e10);
  refuse_builder(f.spectrum, good, 1e7, "trees.resolution_mass = 1e+07 Msun");
  refuse_builder(f.spectrum, good, 9e6, "trees.resolution_mass");
  refuse_builder(f.spectrum, good, NAN, "Msun");
  refuse_builder(f.spectrum, good, 1.1e16, "1.1e+16 Msun");
  static const struct {
    size_t offset;
    double value;
    const char *part;
  } refused[] = {
      {offsetof(ew_tree_parameters, resolution_mass), 10.0, "trees.resolution_mass"},
      {offsetof(ew_tree_parameters, resolution_mass), NAN, "trees.resolution_mass"},
      {offsetof(ew_tree_parameters, highest_redshift), 61.0, "trees.highest_redshift"},
      {offsetof(ew_tree_parameters, split_amplitude), 0.0, "trees.split_amplitude"},
      {offsetof(ew_tree_parameters, split_mass_slope), 1.0, "trees.split_mass_slope"},
      {offsetof(ew_tree_parameters, split_peak_slope), -1.0, "trees.split_peak_slope"},
  };
  for (size_t i = 0; i < sizeof refused / sizeof *refused; i++) {
    ew_tree_parameters bad = good;
    memcpy((char *)&bad + refused[i].offset, &refused[i].value, sizeof(double));
    refuse_builder(f.spectrum, bad, 1e10, refused[i].part);
  }
  fell(&f);
  ew_tree_builder_free(NULL);
  ew_tree_memory_free(NULL);
}

int main(void) {
  ew_core_start();
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(test_structure_of_random_trees),
      cmocka_unit_test(test_smallest_trees),
      cmocka_unit_test(test_too_light_to_split),
      cmocka_unit_test(test_draws_make_the_tree),
      cmocka_unit_test(test_nothing_else_makes_the_tree),
      cmocka_unit_test(test_refusal_spoils_nothing),
      cmocka_unit_test(test_highest_redshift_only_cuts),
      cmocka_unit_test(test_refused_roots),
      cmocka_unit_test(test_refused_builders),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
