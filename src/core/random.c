/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Random streams that are addresses rather than sequences: (seed, process | tree, realization, branch, slot, draw). */
#include "elfinwood/core.h"

#include <Random123/philox.h>
#include <gsl/gsl_cdf.h>
#include <math.h>

enum { BLOCK_BITS = 24 }; /* of the last counter word: up to 2^24 blocks of 4 words in a slot */

/* Poisson means above are drawn by an expansion of the quantile, good to 1e-6 in probability there and better beyond.
 * GSL's distribution function is no help: slow, and from 1e7 on wrong by up to a percent in its lower tail (2.7.1). */
#define LARGEST_SUMMED_MEAN 600.0

static const char *const process_names[EW_PROCESS_COUNT] = {
    [EW_PROCESS_ROOTS] = "roots",   [EW_PROCESS_ASSEMBLY] = "assembly", [EW_PROCESS_STRUCTURE] = "structure",
    [EW_PROCESS_ORBITS] = "orbits", [EW_PROCESS_PATCH] = "patch",       [EW_PROCESS_FIRST_STARS] = "first-stars",
    [EW_PROCESS_BURSTS] = "bursts", [EW_PROCESS_MIXING] = "mixing",     [EW_PROCESS_LIGHT] = "light",
    [EW_PROCESS_SURVEY] = "survey"};

const char *ew_process_name(ew_process process) {
  return process < EW_PROCESS_COUNT ? process_names[process] : "unknown";
}

ew_stream ew_stream_open(const ew_draws *draws, ew_process process, uint64_t branch_key, uint64_t slot) {
  return (ew_stream){.key = {draws->seed, (uint64_t)process},
                     .counter = {draws->tree, draws->realization[process], branch_key, slot << BLOCK_BITS},
                     .used = 4};
}

static void refill(ew_stream *stream) {
  philox4x64_ctr_t counter = {{stream->counter[0], stream->counter[1], stream->counter[2], stream->counter[3]}};
  philox4x64_key_t key = {{stream->key[0], stream->key[1]}};
  philox4x64_ctr_t drawn = philox4x64(counter, key);
  for (int i = 0; i < 4; i++)
    stream->word[i] = drawn.v[i];
  stream->counter[3]++;
  stream->used = 0;
}

uint64_t ew_draw_word(ew_stream *stream) {
  if (stream->used == 4)
    refill(stream);
  return stream->word[stream->used++];
}

/* 52 bits and a half: with one bit more the largest word would round to 1. */
double ew_draw_uniform(ew_stream *stream) {
  return ((double)(ew_draw_word(stream) >> 12) + 0.5) * 0x1p-52;
}

double ew_draw_exponential(ew_stream *stream) {
  return -log(ew_draw_uniform(stream));
}

double ew_draw_normal(ew_stream *stream) {
  return gsl_cdf_ugaussian_Pinv(ew_draw_uniform(stream));
}

/* The Poisson count of u is the smallest k with P(<= k) > u: here by adding up terms from 0, for means at which
 * exp(-mean) is far from underflow and u that rounding of the sum cannot reach. */
static uint64_t poisson_from_zero(double mean, double u) {
  double term = exp(-mean), sum = term;
  uint64_t k = 0;
  while (sum <= u) {
    k++;
    term *= mean / (double)k;
    sum += term;
  }
  return k;
}

/* The quantile as a continuous number, half an integer where two counts meet: Cornish & Fisher (1938) to third order in
 * 1/sqrt(mean) with the Poisson law's cumulants, all equal to the mean, and Sheppard's 1/12 off the variance since
 * counts are whole. */
static double poisson_quantile(double mean, double u) {
  double z = gsl_cdf_ugaussian_Pinv(u), deviation = sqrt(mean);
  return mean + deviation * z + (z * z - 1.0) / 6.0 - z * (z * z + 2.0) / (72.0 * deviation);
}

/* P(> k) < 1 - u, which near u = 1 keeps the digits that P(<= k) > u would lose. */
static bool reaches(double k, double mean, double u) {
  return gsl_cdf_poisson_Q((unsigned)k, mean) < 1.0 - u;
}

static uint64_t poisson_in_upper_tail(double mean, double u) {
  double k = fmax(0.0, nearbyint(poisson_quantile(mean, u)));
  while (!reaches(k, mean, u))
    k += 1.0;
  while (k > 0.0 && reaches(k - 1.0, mean, u))
    k -= 1.0;
  return (uint64_t)k;
}

uint64_t ew_draw_poisson(ew_stream *stream, double mean) {
  double u = ew_draw_uniform(stream);
  if (!(mean > 0.0 && isfinite(mean)))
    return 0;
  if (mean < LARGEST_SUMMED_MEAN)
    return u < 1.0 - 1e-6 ? poisson_from_zero(mean, u) : poisson_in_upper_tail(mean, u);
  double count = nearbyint(poisson_quantile(mean, u));
  return count < 0x1p64 ? (uint64_t)count : UINT64_MAX;
}

/* Finalizer of SplitMix64 (Steele, Lea & Flood 2014, OOPSLA): a bijection that scatters neighbouring inputs. */
static uint64_t scatter(uint64_t x) {
  x += 0x9e3779b97f4a7c15u;
  x = (x ^ (x >> 30)) * 0xbf58476d1ce4e5b9u;
  x = (x ^ (x >> 27)) * 0x94d049bb133111ebu;
  return x ^ (x >> 31);
}

uint64_t ew_branch_key_root(void) {
  return scatter(0);
}

uint64_t ew_branch_key_child(uint64_t parent_key, uint64_t ordinal) {
  return scatter(parent_key ^ scatter(ordinal + 1));
}

uint64_t ew_branch_key_imported(int64_t identifier) {
  return scatter(scatter((uint64_t)identifier) ^ 0x6c6f6e65u);
}
