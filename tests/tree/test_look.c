/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Looking at trees made by hand: the mass of a branch, when it had formed, and what the check of a tree's rules
 * refuses. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>

#include <cmocka.h>

#include "elfinwood/tree.h"

#include <math.h>
#include <string.h>

static const double ROUNDING = 1e-14;

/* A main branch (3) that is joined at z = 2 by a single node (0) and at z = 1 by a branch (2) that had itself swallowed
 * another (1) at z = 3. */
typedef struct {
  ew_branch branch[4];
  double mass[11], redshift[11];
  ew_tree tree;
} family;

static family make_family(void) {
  return (family){
      .branch = {{11, 0, 1, 3, 8}, {12, 1, 1, 2, 4}, {13, 2, 4, 3, 10}, {14, 6, 5, -1, 0}},
      .mass = {30.0, 10.0, 20.0, 25.0, 35.0, 45.0, 60.0, 80.0, 110.0, 130.0, 175.0},
      .redshift = {2.0, 3.0, 5.0, 3.0, 3.0, 1.0, 6.0, 2.0, 2.0, 1.0, 1.0},
      .tree = {.number = 7, .halo_id = -1, .weight = 1.0, .branch_count = 4, .node_count = 11},
  };
}

static ew_tree tree_of(const family *f) {
  ew_tree tree = f->tree;
  tree.branch = f->branch;
  tree.mass = f->mass;
  tree.redshift = f->redshift;
  return tree;
}

/* ---------------------------------------------------------------------------------------------------------------- mass
 */

static void assert_near(double value, double expected) {
  if (!(fabs(value - expected) <= ROUNDING * fabs(expected)))
    fail_msg("%.17g, expected %.17g", value, expected);
}

static void test_mass_between_nodes(void **state) {
  (void)state;
  family f = make_family();
  ew_tree tree = tree_of(&f);
  const ew_branch *root = &tree.branch[3], *satellite = &tree.branch[2];
  assert_near(ew_branch_mass(&tree, root, 6.0), 60.0);
  assert_near(ew_branch_mass(&tree, root, 4.0), 70.0);
  assert_near(ew_branch_mass(&tree, root, 3.0), 75.0);
  assert_near(ew_branch_mass(&tree, root, 1.75), 115.0);
  assert_near(ew_branch_mass(&tree, satellite, 4.5), 21.25);
  assert_near(ew_branch_mass(&tree, satellite, 1.5), 42.5);
}

static void test_mass_at_mergers_and_ends(void **state) {
  (void)state;
  family f = make_family();
  ew_tree tree = tree_of(&f);
  const ew_branch *root = &tree.branch[3], *satellite = &tree.branch[2], *point = &tree.branch[0];
  assert_near(ew_branch_mass(&tree, root, 2.0), 110.0); /* just after the merger */
  assert_near(ew_branch_mass(&tree, root, nextafter(2.0, 3.0)), 80.0);
  assert_near(ew_branch_mass(&tree, root, 1.0), 175.0);
  assert_near(ew_branch_mass(&tree, root, 0.0), 175.0);
  assert_near(ew_branch_mass(&tree, satellite, 3.0), 35.0);
  assert_near(ew_branch_mass(&tree, satellite, 0.5), 45.0); /* after its last node */
  assert_true(ew_branch_mass(&tree, satellite, 5.0001) == 0.0);
  assert_true(ew_branch_mass(&tree, root, 40.0) == 0.0);
  assert_near(ew_branch_mass(&tree, point, 2.0), 30.0);
  assert_near(ew_branch_mass(&tree, point, 1.0), 30.0);
  assert_true(ew_branch_mass(&tree, point, 2.1) == 0.0);
}

/* ----------------------------------------------------------------------------------------------------------- formation
 */

static void test_formation(void **state) {
  (void)state;
  family f = make_family();
  ew_tree tree = tree_of(&f);
  const ew_branch *root = &tree.branch[3], *satellite = &tree.branch[2], *point = &tree.branch[0];
  assert_near(ew_formation_redshift(&tree, root, 0.4), 4.0);           /* 70 */
  assert_near(ew_formation_redshift(&tree, root, 0.5), 2.0);           /* 87.5: by the merger at z = 2 */
  assert_near(ew_formation_redshift(&tree, root, 120.0 / 175.0), 1.5); /* 120 */
  assert_near(ew_formation_redshift(&tree, root, 1.0), 1.0);
  assert_near(ew_formation_redshift(&tree, root, 60.0 / 175.0), 6.0); /* its first mass */
  assert_near(ew_formation_redshift(&tree, root, 0.1), 6.0);          /* never below */
  assert_near(ew_formation_redshift(&tree, satellite, 0.5), 4.0);     /* 22.5 */
  assert_near(ew_formation_redshift(&tree, satellite, 1.5), 1.0);     /* never above */
  assert_near(ew_formation_redshift(&tree, point, 0.5), 2.0);
}

/* Imported branches may lose mass: what counts is the first time. */
static void test_formation_of_a_branch_that_shrinks(void **state) {
  (void)state;
  family f = make_family();
  f.branch[3] = (ew_branch){14, 0, 4, -1, 0};
  memcpy(f.mass, (double[]){10.0, 90.0, 40.0, 100.0}, 4 * sizeof(double));
  memcpy(f.redshift, (double[]){8.0, 6.0, 4.0, 2.0}, 4 * sizeof(double));
  ew_tree tree = tree_of(&f);
  assert_near(ew_formation_redshift(&tree, &tree.branch[3], 0.5), 7.0);
  assert_near(ew_formation_redshift(&tree, &tree.branch[3], 0.9), 6.0);
  assert_near(ew_formation_redshift(&tree, &tree.branch[3], 0.95), 2.0 + 2.0 / 12.0);
  assert_near(ew_branch_mass(&tree, &tree.branch[3], 5.0), 65.0);
}

/* --------------------------------------------------------------------------------------------------------------- check
 */

static void assert_fault(const family *f, const char *part) {
  ew_error error = {0};
  ew_tree tree = tree_of(f);
  if (ew_tree_check(&tree, &error) != EW_REFUSED)
    fail_msg("passed, though \"%s\"", part);
  assert_null(strchr(error.message, '\n'));
  if (!strstr(error.message, part))
    fail_msg("\"%s\" does not say \"%s\"", error.message, part);
}

static void test_check_accepts(void **state) {
  (void)state;
  family f = make_family();
  ew_error error = {0};
  ew_tree tree = tree_of(&f);
  if (ew_tree_check(&tree, &error) != EW_OK)
    fail_msg("%s", error.message);
  f.branch[0] = (ew_branch){11, 0, 1, -1, 0}; /* the smallest tree */
  tree = tree_of(&f);
  tree.branch_count = tree.node_count = 1;
  assert_int_equal(ew_tree_check(&tree, &error), EW_OK);
}

static void test_check_of_nodes(void **state) {
  (void)state;
  static const double bad_masses[] = {0.0, -1.0, NAN, INFINITY}, bad_redshifts[] = {-0.1, NAN, INFINITY, -INFINITY};
  for (size_t i = 0; i < 4; i++) {
    family f = make_family();
    f.mass[3] = bad_masses[i];
    assert_fault(&f, "tree 7, branch 2: a node's mass");
    f = make_family();
    f.redshift[10] = bad_redshifts[i];
    assert_fault(&f, "tree 7, branch 3: a node's redshift is not a number of 0 or more");
  }
  family f = make_family();
  f.redshift[3] = 5.5;
  assert_fault(&f, "branch 2: its nodes do not run to lower redshift");
  f = make_family();
  f.branch[1].node_count = 0;
  assert_fault(&f, "branch 1: its nodes are outside the tree's");
  f = make_family();
  f.branch[3].node_count = 6;
  assert_fault(&f, "branch 3: its nodes are outside the tree's");
  f = make_family();
  f.branch[3].first_node = UINT32_MAX;
  assert_fault(&f, "branch 3: its nodes are outside the tree's");
  f = make_family();
  f.branch[2] = (ew_branch){13, 3, 3, 3, 10};
  assert_fault(&f, "branch 2: its nodes do not follow upon those of the branch before");
  f = make_family();
  f.branch[3].node_count = 4;
  f.branch[2].joins_node = 8;
  f.redshift[5] = 2.0;
  assert_fault(&f, "the tree has nodes of no branch");
  f.tree.branch_count = 0;
  assert_fault(&f, "tree 7 has no branch");
}

static void test_check_of_joins(void **state) {
  (void)state;
  family f = make_family();
  f.branch[3].joins_branch = 2;
  assert_fault(&f, "branch 3: the last branch, and no other, joins nothing");
  f = make_family();
  f.branch[1].joins_branch = -1;
  assert_fault(&f, "branch 1: the last branch, and no other, joins nothing");
  f = make_family();
  f.branch[1].joins_branch = 0;
  assert_fault(&f, "branch 1: it must join a branch that stands after it");
  f = make_family();
  f.branch[1].joins_branch = 1;
  assert_fault(&f, "branch 1: it must join a branch that stands after it");
  f = make_family();
  f.branch[1].joins_branch = 4;
  assert_fault(&f, "branch 1: it must join a branch that stands after it");
  static const uint32_t bad_nodes[] = {0, 6, 11, UINT32_MAX};
  for (size_t i = 0; i < 4; i++) {
    f = make_family();
    f.branch[0].joins_node = bad_nodes[i];
    assert_fault(&f, "branch 0: it must join at a node after its host's first");
  }
  f = make_family();
  f.branch[0].joins_node = 9; /* the first of two nodes at another redshift */
  assert_fault(&f, "branch 0: it does not end at the redshift of the merger's two nodes");
  f = make_family();
  f.redshift[0] = 2.001;
  assert_fault(&f, "branch 0: it does not end at the redshift of the merger's two nodes");
  f = make_family();
  f.branch[0].joins_node = 7; /* the first of the merger's two */
  assert_fault(&f, "branch 0: it does not end at the redshift of the merger's two nodes");
}

/* Branch 0 joins branch 2, but branch 1 stands between and leads elsewhere. */
static void test_check_of_order(void **state) {
  (void)state;
  family f = make_family();
  f.branch[0] = (ew_branch){12, 0, 1, 2, 4};
  f.branch[1] = (ew_branch){11, 1, 1, 3, 8};
  memcpy(f.mass, (double[]){10.0, 30.0}, 2 * sizeof(double));
  memcpy(f.redshift, (double[]){3.0, 2.0}, 2 * sizeof(double));
  assert_fault(&f, "branch 0: between it and the branch that it joins stand branches that lead elsewhere");
}

int main(void) {
  ew_core_start();
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(test_mass_between_nodes), cmocka_unit_test(test_mass_at_mergers_and_ends),
      cmocka_unit_test(test_formation),          cmocka_unit_test(test_formation_of_a_branch_that_shrinks),
      cmocka_unit_test(test_check_accepts),      cmocka_unit_test(test_check_of_nodes),
      cmocka_unit_test(test_check_of_joins),     cmocka_unit_test(test_check_of_order),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
