/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Random streams: the generator against its published vectors, the distributions against their exact laws, and the
 * independence of streams. Every seed is fixed, so a test passes always or never; limits in sigma or p are set where a
 * sound generator fails one in ten thousand times at most. */
#include "elfinwood/core.h"

#include <Random123/philox.h>
#include <gsl/gsl_cdf.h>
#include <gsl/gsl_randist.h>
#include <gsl/gsl_sort.h>
#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#define SMALLEST_P 1e-4

static void expect_within(double found, double wanted, double tolerance) {
  if (!(fabs(found - wanted) <= tolerance))
    fail_msg("%.17g is not within %g of %.17g", found, tolerance, wanted);
}

static ew_stream stream_of(uint64_t seed) {
  const ew_draws draws = {.seed = seed};
  return ew_stream_open(&draws, EW_PROCESS_BURSTS, 17, 3);
}

/* A stream whose next word is given. */
static ew_stream stream_with(uint64_t word) {
  return (ew_stream){.word = {word}, .used = 0};
}

/* ----------------------------------------------------------------------------------------------------- generator */

/* Lines "philox4x64 10" of Random123's kat_vectors (from memory; the library's own code gives the same). */
static const struct {
  uint64_t counter[4], key[2], word[4];
} known_answers[] = {
    {{0, 0, 0, 0}, {0, 0}, {0x16554d9eca36314c, 0xdb20fe9d672d0fdc, 0xd7e772cee186176b, 0x7e68b68aec7ba23b}},
    {{UINT64_MAX, UINT64_MAX, UINT64_MAX, UINT64_MAX},
     {UINT64_MAX, UINT64_MAX},
     {0x87b092c3013fe90b, 0x438c3c67be8d0224, 0x9cc7d7c69cd777b6, 0xa09caebf594f0ba0}},
    {{0x243f6a8885a308d3, 0x13198a2e03707344, 0xa4093822299f31d0, 0x082efa98ec4e6c89},
     {0x452821e638d01377, 0xbe5466cf34e90c6c},
     {0xa528f45403e61d95, 0x38c72dbd566e9788, 0xa5a1610e72fd18b5, 0x57bd43b5e52b7fe6}}};

static void test_words_are_the_published_ones(void **state) {
  (void)state;
  for (size_t i = 0; i < sizeof known_answers / sizeof *known_answers; i++) {
    ew_stream stream = {.used = 4};
    memcpy(stream.counter, known_answers[i].counter, sizeof stream.counter);
    memcpy(stream.key, known_answers[i].key, sizeof stream.key);
    for (int j = 0; j < 4; j++)
      assert_true(ew_draw_word(&stream) == known_answers[i].word[j]);
  }
}

static void test_the_address_of_a_draw_is_its_counter_and_key(void **state) {
  (void)state;
  ew_draws draws = {.seed = 11, .tree = 22};
  draws.realization[EW_PROCESS_MIXING] = 33;
  ew_stream stream = ew_stream_open(&draws, EW_PROCESS_MIXING, 44, 55);
  for (uint64_t block = 0; block < 5; block++) {
    const philox4x64_ctr_t counter = {{22, 33, 44, (55 << 24) + block}};
    const philox4x64_key_t key = {{11, EW_PROCESS_MIXING}};
    philox4x64_ctr_t wanted = philox4x64_R(10, counter, key);
    for (int i = 0; i < 4; i++)
      assert_true(ew_draw_word(&stream) == wanted.v[i]);
  }
}

static void test_the_first_stream_of_all_is_known(void **state) {
  (void)state;
  const ew_draws draws = {0};
  ew_stream stream = ew_stream_open(&draws, EW_PROCESS_ROOTS, 0, 0);
  for (int i = 0; i < 4; i++)
    assert_true(ew_draw_word(&stream) == known_answers[0].word[i]);
}

static void test_a_stream_is_reproducible(void **state) {
  (void)state;
  ew_stream a = stream_of(5), b = stream_of(5);
  for (int i = 0; i < 100; i++)
    assert_true(ew_draw_word(&a) == ew_draw_word(&b));
}

static void test_processes_have_names_of_their_own(void **state) {
  (void)state;
  for (ew_process i = 0; i < EW_PROCESS_COUNT; i++) {
    assert_non_null(ew_process_name(i));
    for (ew_process j = 0; j < i; j++)
      assert_string_not_equal(ew_process_name(i), ew_process_name(j));
  }
  assert_string_equal(ew_process_name(EW_PROCESS_FIRST_STARS), "first-stars");
  assert_string_equal(ew_process_name(EW_PROCESS_COUNT), "unknown");
}

/* -------------------------------------------------------------------------------------------- one word, one draw */

static void test_uniform_never_reaches_its_ends(void **state) {
  (void)state;
  ew_stream lowest = stream_with(0), highest = stream_with(UINT64_MAX);
  double low = ew_draw_uniform(&lowest), high = ew_draw_uniform(&highest);
  assert_true(low > 0.0 && low < 1e-15);
  assert_true(high < 1.0 && high > 1.0 - 1e-15);
  lowest = stream_with(0);
  highest = stream_with(UINT64_MAX);
  assert_true(isfinite(ew_draw_normal(&lowest)) && isfinite(ew_draw_normal(&highest)));
  lowest = stream_with(0);
  highest = stream_with(UINT64_MAX);
  assert_true(isfinite(ew_draw_exponential(&lowest)) && ew_draw_exponential(&highest) > 0.0);
}

static void test_each_draw_takes_one_word(void **state) {
  (void)state;
  for (unsigned kind = 0; kind < 5; kind++) {
    ew_stream stream = stream_of(9), words = stream_of(9);
    for (int i = 0; i < 3; i++) {
      if (kind == 0)
        (void)ew_draw_uniform(&stream);
      else if (kind == 1)
        (void)ew_draw_exponential(&stream);
      else if (kind == 2)
        (void)ew_draw_normal(&stream);
      else
        (void)ew_draw_poisson(&stream, kind == 3 ? 0.0 : 1e3);
      (void)ew_draw_word(&words);
    }
    assert_true(ew_draw_word(&stream) == ew_draw_word(&words));
  }
}

/* ------------------------------------------------------------------------------------------------- distributions */

enum { DRAWS = 200000 };

/* Kolmogorov-Smirnov: the largest distance between the distribution function and that of the sample, over the limit
 * sqrt(-ln(p/2) / (2 n)) (Smirnov 1948; asymptotic, accurate at this n). */
static void expect_distribution(double (*draw)(ew_stream *), double (*distribution)(double)) {
  double *sample = malloc(DRAWS * sizeof *sample);
  assert_non_null(sample);
  ew_stream stream = stream_of(1);
  for (size_t i = 0; i < DRAWS; i++)
    sample[i] = draw(&stream);
  gsl_sort(sample, 1, DRAWS);
  double distance = 0.0;
  for (size_t i = 0; i < DRAWS; i++) {
    double below = distribution(sample[i]);
    distance = fmax(distance, fmax(below - (double)i / DRAWS, (double)(i + 1) / DRAWS - below));
  }
  free(sample);
  assert_true(distance < sqrt(-log(SMALLEST_P / 2.0) / (2.0 * DRAWS)));
}

static double uniform_distribution(double x) {
  return x;
}

static double exponential_distribution(double x) {
  return -expm1(-x);
}

static void test_uniform_is_uniform(void **state) {
  (void)state;
  expect_distribution(ew_draw_uniform, uniform_distribution);
}

static void test_exponential_is_exponential(void **state) {
  (void)state;
  expect_distribution(ew_draw_exponential, exponential_distribution);
}

static void test_normal_is_normal(void **state) {
  (void)state;
  expect_distribution(ew_draw_normal, gsl_cdf_ugaussian_P);
  double sum = 0.0, square = 0.0, fourth = 0.0;
  ew_stream stream = stream_of(2);
  for (size_t i = 0; i < DRAWS; i++) {
    double x = ew_draw_normal(&stream);
    sum += x;
    square += x * x;
    fourth += x * x * x * x;
  }
  expect_within(sum / DRAWS, 0.0, 4.0 * sqrt(1.0 / DRAWS));
  expect_within(square / DRAWS, 1.0, 4.0 * sqrt(2.0 / DRAWS));
  expect_within(fourth / DRAWS, 3.0, 4.0 * sqrt(96.0 / DRAWS)); /* variance of x^4: 105 - 9 */
}

/* Quantiles of Abramowitz & Stegun table 26.5: one word, whose place in the unit interval is known. */
static void test_normal_quantiles_are_exact(void **state) {
  (void)state;
  static const double probability[] = {0.5, 0.841344746068543, 0.975, 0.999, 1e-9};
  static const double quantile[] = {0.0, 1.0, 1.959963984540054, 3.090232306167814, -5.997807015007687};
  for (size_t i = 0; i < sizeof probability / sizeof *probability; i++) {
    ew_stream stream = stream_with((uint64_t)(probability[i] * 0x1p64));
    expect_within(ew_draw_normal(&stream), quantile[i], 1e-6); /* at 1e-9 half a step of 2^-53 is 1e-7 of it */
  }
}

/* P(<= k): GSL's where that is sound, else the normal law and its first correction for skewness (Abramowitz & Stegun
 * 26.2.48 with half a count added), whose error is below 1 / (10 mean). */
static double poisson_distribution(double k, double mean) {
  if (mean < 1e5)
    return gsl_cdf_poisson_P((unsigned)k, mean);
  double x = (k + 0.5 - mean) / sqrt(mean);
  return gsl_cdf_ugaussian_P(x) - (x * x - 1.0) / (6.0 * sqrt(mean)) * gsl_ran_ugaussian_pdf(x);
}

/* Chi-square of counts against the exact law, in bins of some forty equal parts of the normal range, the tails apart.
 */
static void expect_poisson(double mean) {
  enum { BINS = 40, COUNT = 100000 };
  double edge[BINS], wanted[BINS + 1], found[BINS + 1] = {0.0};
  for (int i = 0; i < BINS; i++)
    edge[i] = floor(fmax(0.0, mean + sqrt(mean) * (-3.0 + 6.0 * i / (BINS - 1))));
  for (int i = 0; i <= BINS; i++)
    wanted[i] = COUNT * ((i < BINS ? poisson_distribution(edge[i], mean) : 1.0) -
                         (i > 0 ? poisson_distribution(edge[i - 1], mean) : 0.0));
  ew_stream stream = stream_of(3);
  for (int i = 0; i < COUNT; i++) {
    double drawn = (double)ew_draw_poisson(&stream, mean);
    int bin = 0;
    while (bin < BINS && drawn > edge[bin])
      bin++;
    found[bin] += 1.0;
  }
  double chi_square = 0.0, freedom = -1.0;
  for (int i = 0; i <= BINS; i++) {
    if (wanted[i] < 10.0) {
      expect_within(found[i], wanted[i], 20.0);
      continue;
    }
    chi_square += (found[i] - wanted[i]) * (found[i] - wanted[i]) / wanted[i];
    freedom += 1.0;
  }
  assert_true(freedom >= 1.0);
  double p = gsl_cdf_chisq_Q(chi_square, freedom);
  if (!(p > SMALLEST_P))
    fail_msg("Poisson of mean %g: chi-square %g for %g degrees of freedom", mean, chi_square, freedom);
}

static void test_poisson_follows_its_law(void **state) {
  (void)state;
  static const double means[] = {0.1, 3.0, 29.9, 30.1, 599.0, 601.0, 1000.0, 1e9};
  for (size_t i = 0; i < sizeof means / sizeof *means; i++)
    expect_poisson(means[i]);
}

/* The smallest k with P(<= k) > u, summed up to 40 digits with mpmath 1.3: both methods, both tails, and the expansion
 * for large means. The uniform number of a word is (word / 4096 + 1/2) / 2^52. */
static const struct {
  double mean;
  uint64_t word, count;
} quantiles[] = {
    {0.7, 0x0000000012345678, 0},
    {0.7, 0x00fedcba98765432, 0},
    {0.7, 0x4000000000000000, 0},
    {0.7, 0xa5a5a5a5a5a5a5a5, 1},
    {0.7, 0xfff0123456789abc, 5},
    {0.7, 0xfffffffffff12345, 13},
    {12.0, 0x0000000012345678, 0},
    {12.0, 0x00fedcba98765432, 4},
    {12.0, 0x4000000000000000, 10},
    {12.0, 0xa5a5a5a5a5a5a5a5, 13},
    {12.0, 0xfff0123456789abc, 26},
    {12.0, 0xfffffffffff12345, 46},
    {29.999, 0x0000000012345678, 2},
    {29.999, 0x00fedcba98765432, 17},
    {29.999, 0x4000000000000000, 26},
    {29.999, 0xa5a5a5a5a5a5a5a5, 32},
    {29.999, 0xfff0123456789abc, 51},
    {29.999, 0xfffffffffff12345, 79},
    {30.0, 0x0000000012345678, 2},
    {30.0, 0x00fedcba98765432, 17},
    {30.0, 0x4000000000000000, 26},
    {30.0, 0xa5a5a5a5a5a5a5a5, 32},
    {30.0, 0xfff0123456789abc, 51},
    {30.0, 0xfffffffffff12345, 79},
    {417.0, 0x0000000012345678, 289},
    {417.0, 0x00fedcba98765432, 364},
    {417.0, 0x4000000000000000, 403},
    {417.0, 0xa5a5a5a5a5a5a5a5, 425},
    {417.0, 0xfff0123456789abc, 490},
    {417.0, 0xfffffffffff12345, 578},
    {9999.0, 0x0000000012345678, 9343},
    {9999.0, 0x00fedcba98765432, 9734},
    {9999.0, 0x4000000000000000, 9931},
    {9999.0, 0xa5a5a5a5a5a5a5a5, 10037},
    {9999.0, 0xfff0123456789abc, 10350},
    {9999.0, 0xfffffffffff12345, 10751},
    {10001.0, 0x0000000012345678, 9345},
    {10001.0, 0x00fedcba98765432, 9736},
    {10001.0, 0x4000000000000000, 9933},
    {10001.0, 0xa5a5a5a5a5a5a5a5, 10039},
    {10001.0, 0xfff0123456789abc, 10352},
    {10001.0, 0xfffffffffff12345, 10753},
    {100000.0, 0x0000000012345678, 97910},
    {100000.0, 0x00fedcba98765432, 99159},
    {100000.0, 0x4000000000000000, 99787},
    {100000.0, 0xa5a5a5a5a5a5a5a5, 100119},
    {100000.0, 0xfff0123456789abc, 101105},
    {100000.0, 0xfffffffffff12345, 102360},
    {10000000.0, 0x0000000012345678, 9979035},
    {10000000.0, 0x00fedcba98765432, 9991584},
    {10000000.0, 0x4000000000000000, 9997867},
    {10000000.0, 0xa5a5a5a5a5a5a5a5, 10001193},
    {10000000.0, 0xfff0123456789abc, 10011033},
    {10000000.0, 0xfffffffffff12345, 10023517},
    /* so near to a step: 1e-6 counts where the sum is exact, then 0.002 and 0.0005 */
    {599.0, 0x00484bd091867abc, 525},
    {599.0, 0x00484bd1d599fabc, 526},
    {599.0, 0xf9a34a73e101aabc, 647},
    {599.0, 0xf9a34a888fd45abc, 648},
    {601.0, 0x0049929682898abc, 527},
    {601.0, 0x00499c9fd258eabc, 528},
    {601.0, 0x05478fb18bd22abc, 551},
    {601.0, 0x054815dadb504abc, 552},
    {601.0, 0xfa29636394877abc, 650},
    {601.0, 0xfa29f978e3aa8abc, 651},
    {601.0, 0xff96b1773abdfabc, 674},
    {601.0, 0xff96bff7bc9d4abc, 675},
    {10001.0, 0x00534339916baabc, 9700},
    {10001.0, 0x005343ecbcbfbabc, 9701},
    {10001.0, 0x05aff65a5bcc6abc, 9800},
    {10001.0, 0x05afff3390be9abc, 9801},
    {10001.0, 0xfa2cbc861c9e0abc, 10201},
    {10001.0, 0xfa2cc59cff750abc, 10202},
    {10001.0, 0xffa513107e95fabc, 10301},
    {10001.0, 0xffa513d4a05f9abc, 10302},
};

static void test_poisson_inverts_its_distribution(void **state) {
  (void)state;
  for (size_t i = 0; i < sizeof quantiles / sizeof *quantiles; i++) {
    ew_stream stream = stream_with(quantiles[i].word);
    assert_int_equal(ew_draw_poisson(&stream, quantiles[i].mean), quantiles[i].count);
  }
}

static void test_poisson_rises_with_the_mean(void **state) {
  (void)state;
  ew_stream words = stream_of(6);
  for (int i = 0; i < 300; i++) {
    uint64_t word = i == 0 ? 0 : i == 1 ? UINT64_MAX : ew_draw_word(&words), last = 0;
    for (double mean = 1e-3; mean < 1e11; mean *= 1.09) {
      ew_stream stream = stream_with(word);
      uint64_t count = ew_draw_poisson(&stream, mean);
      assert_true(count >= last);
      last = count;
    }
  }
}

static void test_poisson_rises_with_the_word(void **state) {
  (void)state;
  static const double means[] = {0.1, 3.0, 29.9, 30.1, 599.0, 601.0, 1000.0, 1e9};
  for (size_t i = 0; i < sizeof means / sizeof *means; i++) {
    uint64_t last = 0;
    for (uint64_t step = 0; step < 2000; step++) {
      ew_stream stream = stream_with(step * (UINT64_MAX / 1999));
      uint64_t count = ew_draw_poisson(&stream, means[i]);
      assert_true(count >= last);
      last = count;
    }
  }
}

static void test_poisson_stays_sane_at_its_ends(void **state) {
  (void)state;
  static const double none[] = {0.0, -1.0, (double)NAN, HUGE_VAL, -HUGE_VAL};
  for (size_t i = 0; i < sizeof none / sizeof *none; i++) {
    ew_stream stream = stream_of(7);
    assert_true(ew_draw_poisson(&stream, none[i]) == 0);
  }
  ew_stream highest = stream_with(UINT64_MAX); /* 40 digits give 9 too */
  assert_int_equal(ew_draw_poisson(&highest, 0.1), 9);
  ew_stream stream = stream_of(7);
  expect_within((double)ew_draw_poisson(&stream, 1e18) / 1e18, 1.0, 1e-8);
  assert_true(ew_draw_poisson(&stream, 1e300) == UINT64_MAX);
}

/* -------------------------------------------------------------------------------------------------- independence */

enum { COMPARED = 20000 };

/* Correlation of two streams and share of equal bits: both of known variance if they are independent. */
static void expect_unrelated(ew_stream a, ew_stream b) {
  double product = 0.0, equal_bits = 0.0;
  for (int i = 0; i < COMPARED; i++) {
    uint64_t x = ew_draw_word(&a), y = ew_draw_word(&b);
    assert_true(x != y);
    product += ((double)(x >> 11) * 0x1p-53 - 0.5) * ((double)(y >> 11) * 0x1p-53 - 0.5);
    equal_bits += 64 - __builtin_popcountll(x ^ y);
  }
  expect_within(12.0 * product / COMPARED, 0.0, 4.5 * sqrt(1.0 / COMPARED));
  expect_within(equal_bits / (64.0 * COMPARED), 0.5, 4.5 * 0.5 / sqrt(64.0 * COMPARED));
}

static void test_streams_at_other_addresses_are_unrelated(void **state) {
  (void)state;
  const ew_draws base = {.seed = 1, .tree = 1};
  const ew_stream stream = ew_stream_open(&base, EW_PROCESS_BURSTS, 1, 1);
  expect_unrelated(stream, ew_stream_open(&base, EW_PROCESS_BURSTS, 1, 2));
  expect_unrelated(stream, ew_stream_open(&base, EW_PROCESS_BURSTS, 2, 1));
  expect_unrelated(stream, ew_stream_open(&base, EW_PROCESS_MIXING, 1, 1));
  ew_draws other = base;
  other.realization[EW_PROCESS_BURSTS] = 1;
  expect_unrelated(stream, ew_stream_open(&other, EW_PROCESS_BURSTS, 1, 1));
  other = base;
  other.tree = 2;
  expect_unrelated(stream, ew_stream_open(&other, EW_PROCESS_BURSTS, 1, 1));
  other = base;
  other.seed = 2;
  expect_unrelated(stream, ew_stream_open(&other, EW_PROCESS_BURSTS, 1, 1));
}

static void test_another_process_can_be_redrawn_alone(void **state) {
  (void)state;
  const ew_draws base = {.seed = 1, .tree = 1};
  ew_draws other = base;
  other.realization[EW_PROCESS_MIXING] = 5;
  ew_stream a = ew_stream_open(&base, EW_PROCESS_BURSTS, 1, 1), b = ew_stream_open(&other, EW_PROCESS_BURSTS, 1, 1);
  for (int i = 0; i < 100; i++)
    assert_true(ew_draw_word(&a) == ew_draw_word(&b));
}

/* A slot has 2^24 blocks of its own: the last word of one slot comes before the first of the next. */
static void test_slots_do_not_overlap(void **state) {
  (void)state;
  const ew_draws draws = {.seed = 1};
  ew_stream slot = ew_stream_open(&draws, EW_PROCESS_BURSTS, 1, 6);
  ew_stream next = ew_stream_open(&draws, EW_PROCESS_BURSTS, 1, 7);
  assert_true(next.counter[3] - slot.counter[3] == UINT64_C(1) << 24);
  ew_stream last = ew_stream_open(&draws, EW_PROCESS_BURSTS, 1, (UINT64_C(1) << 40) - 1);
  assert_true(last.counter[3] == UINT64_MAX - ((UINT64_C(1) << 24) - 1));
}

static int by_value(const void *a, const void *b) {
  uint64_t x = *(const uint64_t *)a, y = *(const uint64_t *)b;
  return (x > y) - (x < y);
}

static void expect_no_repeat(uint64_t *key, size_t count) {
  qsort(key, count, sizeof *key, by_value);
  for (size_t i = 1; i < count; i++)
    assert_true(key[i] != key[i - 1]);
}

/* Children of the root, their children and so on, and imported names beside them: by chance two of 1.1e6 keys of 64
 * bits agree once in 3e7 times. */
static void test_branch_keys_are_all_different(void **state) {
  (void)state;
  enum { GROWN = 1000000, IMPORTED = 100000, SPLITS = 10 };
  uint64_t *key = malloc((GROWN + IMPORTED) * sizeof *key);
  assert_non_null(key);
  key[0] = ew_branch_key_root();
  for (size_t i = 1; i < GROWN; i++)
    key[i] = ew_branch_key_child(key[(i - 1) / SPLITS], (i - 1) % SPLITS);
  for (int64_t i = 0; i < IMPORTED; i++)
    key[GROWN + i] = ew_branch_key_imported(i - 1);
  expect_no_repeat(key, GROWN + IMPORTED);
  for (size_t i = 0; i < GROWN; i++)
    key[i] = ew_branch_key_child(ew_branch_key_root(), i);
  expect_no_repeat(key, GROWN);
  free(key);
}

/* Parents and ordinals that differ in the same few bits must not make up for each other. */
static void test_branch_keys_of_neighbours_are_all_different(void **state) {
  (void)state;
  enum { SIDE = 1000 };
  uint64_t *key = malloc(SIDE * SIDE * sizeof *key);
  assert_non_null(key);
  for (size_t i = 0; i < SIDE * SIDE; i++)
    key[i] = ew_branch_key_child(i / SIDE, i % SIDE);
  expect_no_repeat(key, SIDE * SIDE);
  free(key);
}

/* Neighbouring ordinals and identifiers differ in half of the bits of their keys. */
static void test_branch_keys_are_scattered(void **state) {
  (void)state;
  double child_bits = 0.0, imported_bits = 0.0;
  for (uint64_t i = 0; i < COMPARED; i++) {
    child_bits += __builtin_popcountll(ew_branch_key_child(7, i) ^ ew_branch_key_child(7, i + 1));
    imported_bits += __builtin_popcountll(ew_branch_key_imported((int64_t)i) ^ ew_branch_key_imported((int64_t)i + 1));
  }
  expect_within(child_bits / (64.0 * COMPARED), 0.5, 4.5 * 0.5 / sqrt(64.0 * COMPARED));
  expect_within(imported_bits / (64.0 * COMPARED), 0.5, 4.5 * 0.5 / sqrt(64.0 * COMPARED));
}

static void test_order_of_splits_matters(void **state) {
  (void)state;
  uint64_t root = ew_branch_key_root();
  assert_true(ew_branch_key_child(ew_branch_key_child(root, 1), 2) !=
              ew_branch_key_child(ew_branch_key_child(root, 2), 1));
}

int main(void) {
  ew_core_start();
  const struct CMUnitTest tests[] = {cmocka_unit_test(test_words_are_the_published_ones),
                                     cmocka_unit_test(test_the_address_of_a_draw_is_its_counter_and_key),
                                     cmocka_unit_test(test_the_first_stream_of_all_is_known),
                                     cmocka_unit_test(test_a_stream_is_reproducible),
                                     cmocka_unit_test(test_processes_have_names_of_their_own),
                                     cmocka_unit_test(test_uniform_never_reaches_its_ends),
                                     cmocka_unit_test(test_each_draw_takes_one_word),
                                     cmocka_unit_test(test_uniform_is_uniform),
                                     cmocka_unit_test(test_exponential_is_exponential),
                                     cmocka_unit_test(test_normal_is_normal),
                                     cmocka_unit_test(test_normal_quantiles_are_exact),
                                     cmocka_unit_test(test_poisson_follows_its_law),
                                     cmocka_unit_test(test_poisson_inverts_its_distribution),
                                     cmocka_unit_test(test_poisson_rises_with_the_mean),
                                     cmocka_unit_test(test_poisson_rises_with_the_word),
                                     cmocka_unit_test(test_poisson_stays_sane_at_its_ends),
                                     cmocka_unit_test(test_streams_at_other_addresses_are_unrelated),
                                     cmocka_unit_test(test_another_process_can_be_redrawn_alone),
                                     cmocka_unit_test(test_slots_do_not_overlap),
                                     cmocka_unit_test(test_branch_keys_are_all_different),
                                     cmocka_unit_test(test_branch_keys_of_neighbours_are_all_different),
                                     cmocka_unit_test(test_branch_keys_are_scattered),
                                     cmocka_unit_test(test_order_of_splits_matters)};
  return cmocka_run_group_tests(tests, NULL, NULL);
}
