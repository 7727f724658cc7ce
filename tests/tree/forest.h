/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What the tests of this room share: a universe with a builder and room for one tree, coefficients, and the test of
 * Kolmogorov for numbers that must be uniform. Include it after cmocka.h. */
#ifndef EW_TESTS_TREE_FOREST_H
#define EW_TESTS_TREE_FOREST_H

#include "cosmology/reference.h"
#include "elfinwood/tree.h"

typedef struct {
  ew_cosmology *cosmology;
  ew_spectrum *spectrum;
  ew_tree_builder *builder;
  ew_tree_memory *memory;
} forest;

/* G0, gamma1, gamma2 */
typedef double split_coefficients[3];
static const split_coefficients published = {0.57, 0.38, -0.01}, plain = {1.0, 0.0, 0.0};

/* h, Omega_m, Omega_b, n_s, sigma8: like ours, no Lambda, nearly empty, no baryons, a corner of what is allowed */
static const double odd_universes[][5] = {
    {0.6736, 0.3153, 0.0493, 0.9649, 0.8111},
    {0.5, 1.0, 0.05, 1.0, 0.6},
    {0.5, 0.1, 0.02, 1.2, 1.5},
    {0.7, 0.3, 0.0, 0.8, 0.3},
    {1.2, 0.05, 0.01, 1.5, 3.0},
};
/* The published ones, plain extended Press-Schechter, and corners of what is allowed. */
static const split_coefficients odd_coefficients[] = {
    {0.57, 0.38, -0.01}, {1.0, 0.0, 0.0}, {0.3, 0.9, 0.5}, {0.8, -0.5, -0.5}, {0.6, 0.5, -0.5}, {0.5, -0.3, 0.2},
};
enum {
  ODD_UNIVERSES = sizeof odd_universes / sizeof *odd_universes,
  ODD_COEFFICIENTS = sizeof odd_coefficients / sizeof *odd_coefficients
};

static inline ew_cosmology_parameters odd_universe(size_t index) {
  ew_cosmology_parameters p = planck18;
  p.hubble = odd_universes[index][0];
  p.omega_matter = odd_universes[index][1];
  p.omega_baryon = odd_universes[index][2];
  p.spectral_index = odd_universes[index][3];
  p.sigma8 = odd_universes[index][4];
  return p;
}

static inline ew_tree_parameters tree_parameters(double resolution, const split_coefficients coefficients) {
  return (ew_tree_parameters){.resolution_mass = resolution,
                              .highest_redshift = 40.0,
                              .split_amplitude = coefficients[0],
                              .split_mass_slope = coefficients[1],
                              .split_peak_slope = coefficients[2]};
}

static inline forest plant(const ew_cosmology_parameters *universe, const ew_tree_parameters *parameters,
                           double largest_mass) {
  ew_error error = {0};
  forest f = {.cosmology = make_cosmology(universe), .memory = ew_tree_memory_new()};
  assert_non_null(f.memory);
  f.spectrum = make_spectrum(f.cosmology, EW_TRANSFER_EISENSTEIN_HU);
  if (ew_tree_builder_new(&f.builder, f.spectrum, parameters, largest_mass, &error) != EW_OK)
    fail_msg("%s", error.message);
  return f;
}

static inline void fell(forest *f) {
  ew_tree_memory_free(f->memory);
  ew_tree_builder_free(f->builder);
  ew_spectrum_free(f->spectrum);
  ew_cosmology_free(f->cosmology);
}

/* The tree of that number under one seed, checked. */
static inline ew_tree grow(const forest *f, double mass, double redshift, uint64_t number) {
  ew_error error = {0};
  ew_tree tree;
  ew_root root = {.number = number, .halo_id = -1, .weight = 1.0, .mass = mass, .redshift = redshift};
  ew_draws draws = {.seed = 20080413, .tree = number};
  if (ew_tree_grow(f->builder, &root, &draws, f->memory, &tree, &error) != EW_OK ||
      ew_tree_check(&tree, &error) != EW_OK)
    fail_msg("root of %.17g Msun at z = %.17g: %s", mass, redshift, error.message);
  return tree;
}

static inline const ew_branch *main_branch(const ew_tree *tree) {
  return &tree->branch[tree->branch_count - 1];
}

static inline size_t last_node(const ew_branch *branch) {
  return branch->first_node + (size_t)branch->node_count - 1;
}

/* The law that trees are grown by, written down once more without tables or clocks. */
typedef struct {
  const ew_spectrum *spectrum;
  const double *coefficients;
  double mass;
} law;

/* q dN/dq by Parkinson, Cole & Helly 2008, MNRAS 383, 557, at barrier 1. */
static inline double law_density(const law *l, double log_share) {
  double share = exp(log_share), sigma1 = ew_sigma(l->spectrum, share * l->mass);
  double sigma2 = ew_sigma(l->spectrum, l->mass), slope = -ew_sigma_slope(l->spectrum, share * l->mass);
  double gap = sigma1 * sigma1 - sigma2 * sigma2;
  double correction =
      l->coefficients[0] * pow(sigma1 / sigma2, l->coefficients[1]) * pow(1.0 / sigma2, l->coefficients[2]);
  return sqrt(2.0 / EW_PI) * sigma1 * sigma1 / pow(gap, 1.5) * slope * correction / share;
}

static inline int compare_numbers(const void *a, const void *b) {
  double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

/* Sorts the numbers and refuses them if they are not uniform in (0, 1) by the test of Kolmogorov at the level 1e-5:
 * P(D sqrt(n) > 2.47) = 2 exp(-2 2.47^2). */
static inline void assert_uniform(double *number, size_t count, const char *what) {
  double distance = 0.0;
  qsort(number, count, sizeof *number, compare_numbers);
  for (size_t i = 0; i < count; i++) {
    double low = (double)i / (double)count, high = (double)(i + 1) / (double)count;
    distance = fmax(distance, fmax(fabs(number[i] - low), fabs(number[i] - high)));
  }
  if (!(distance * sqrt((double)count) < 2.47))
    fail_msg("%s: %zu numbers are %.2f/sqrt(n) from uniform, allowed 2.47", what, count,
             distance * sqrt((double)count));
}

#endif
