/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * core: what every other room stands on - errors, memory, constants, random streams, tables on uniform grids and the
 * engine that reads, checks, prints and echoes parameters.
 *
 * Units throughout the library: Msun, kpc (proper unless a comment says otherwise), km/s, Gyr; the cosmology room uses
 * comoving Mpc. */
#ifndef ELFINWOOD_CORE_H
#define ELFINWOOD_CORE_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>

#if defined(__GNUC__)
#define EW_CHECKED          __attribute__((warn_unused_result))
#define EW_FORMAT(at, args) __attribute__((format(printf, at, args)))
#else
#define EW_CHECKED
#define EW_FORMAT(at, args)
#endif

/* ---------------------------------------------------------------------------------------------------------- errors */

/* The value is the program's exit status. */
typedef enum {
  EW_OK = 0,
  EW_FAILED = 1, /* the work could not be finished: memory, disk, numerics, interrupted */
  EW_REFUSED = 2 /* the request is wrong: bad parameter, unreadable or foreign input */
} ew_status;

enum { EW_MESSAGE_SIZE = 1536 };

/* The first failure of a call chain, in one line for people. Zero-initialise it; one per thread. */
typedef struct {
  ew_status status;
  char message[EW_MESSAGE_SIZE];
} ew_error;

/* Records the failure unless an earlier one stands there already, and returns `status`. `error` may be NULL. */
ew_status ew_fail(ew_error *error, ew_status status, const char *format, ...) EW_FORMAT(3, 4);

/* EW_FAILED with "out of memory" and what was wanted. */
ew_status ew_fail_memory(ew_error *error, const char *what);

/* EW_FAILED with GSL's own text for `gsl_status` and what was being computed. */
ew_status ew_fail_gsl(ew_error *error, int gsl_status, const char *what);

/* Switches GSL's abort-on-error handler off for the whole process: call once from main, before any thread starts. */
void ew_core_start(void);

/* The program version, e.g. "0.1.0". */
const char *ew_version(void);

/* ------------------------------------------------------------------------------------------------------- constants */

/* CODATA 2018 and IAU 2015 nominal values, in the library's units. */

#define EW_GRAVITY          4.300917270e-6    /* G [kpc km^2/s^2/Msun]: GM_sun of IAU 2015 B3, parsec of IAU 2015 B2 */
#define EW_KMS_IN_KPC_GYR   1.022712165045695 /* 1 km/s in kpc/Gyr, Julian year */
#define EW_LIGHT_SPEED      299792.458        /* km/s, exact */
#define EW_CRITICAL_DENSITY 2.775366272458e11 /* 3 (100 km/s/Mpc)^2 / (8 pi G) [Msun/Mpc^3], times h^2 */
#define EW_HUBBLE_TIME      9.777922216808    /* 1/(100 km/s/Mpc) [Gyr], divided by h; Julian year */
#define EW_SOLAR_MASS_IN_G  1.988409871e33    /* g: GM_sun of IAU 2015 B3 over CODATA 2018 G */
#define EW_MYR              1e-3              /* Gyr */
#define EW_SUPERNOVA_ENERGY 5.02914422e7      /* 1e51 erg [Msun km^2/s^2] */
#define EW_PI               3.14159265358979323846

/* ----------------------------------------------------------------------------------------------------------- arena */

/* Memory that is handed out in pieces and taken back all at once. Pointers stay valid until the arena is reset past
 * them or freed. Not thread-safe: one per thread. */

typedef struct ew_arena ew_arena;
typedef struct {
  void *block;
  size_t used;
} ew_arena_mark;

ew_arena *ew_arena_new(void);        /* NULL when memory is short */
void ew_arena_free(ew_arena *arena); /* accepts NULL */

/* `size` zeroed bytes aligned for any type; NULL when memory is short. */
void *ew_arena_take(ew_arena *arena, size_t size);

ew_arena_mark ew_arena_tell(const ew_arena *arena);
void ew_arena_return(ew_arena *arena, ew_arena_mark mark); /* everything taken since `mark` is free again */

/* -------------------------------------------------------------------------------------------------- random streams */

/* Counter-based: Philox4x64-10 (Salmon et al. 2011, SC11) of Random123. The key is (seed, process), the counter (tree
 * number, realization of that process, branch key, slot and draw within the slot), so no draw depends on how many were
 * made elsewhere. */

typedef enum {
  EW_PROCESS_ROOTS,
  EW_PROCESS_ASSEMBLY,
  EW_PROCESS_STRUCTURE,
  EW_PROCESS_ORBITS,
  EW_PROCESS_PATCH,
  EW_PROCESS_FIRST_STARS,
  EW_PROCESS_BURSTS,
  EW_PROCESS_MIXING,
  EW_PROCESS_LIGHT,
  EW_PROCESS_SURVEY,
  EW_PROCESS_COUNT
} ew_process;

/* "roots", "assembly", ... */
const char *ew_process_name(ew_process process);

/* Which draws: the seed, the tree and each process's realization number. */
typedef struct {
  uint64_t seed;
  uint64_t tree;
  uint64_t realization[EW_PROCESS_COUNT];
} ew_draws;

typedef struct {
  uint64_t key[2];
  uint64_t counter[4];
  uint64_t word[4];
  unsigned used;
} ew_stream;

/* The stream of one slot of one branch; `slot` < 2^40, and up to 2^26 words are drawn from it. */
ew_stream ew_stream_open(const ew_draws *draws, ew_process process, uint64_t branch_key, uint64_t slot);

uint64_t ew_draw_word(ew_stream *stream);
double ew_draw_uniform(ew_stream *stream);     /* open interval (0, 1), 52 bits */
double ew_draw_exponential(ew_stream *stream); /* mean 1; one word */
double ew_draw_normal(ew_stream *stream);      /* mean 0, variance 1, by inversion: one word, monotonic in it */

/* Poisson count by inversion: one word, monotonic in it and in the mean, so that paired models draw alike. `mean` >= 0;
 * above 600 by an expansion of the quantile, good to 1e-6 in probability. A mean that is not finite gives 0. */
uint64_t ew_draw_poisson(ew_stream *stream, double mean);

/* Intrinsic names of branches: a constant at the root; for a child a mix of its parent's key and the ordinal of the
 * split on the parent; for an imported halo a hash of its identifier. */
uint64_t ew_branch_key_root(void);
uint64_t ew_branch_key_child(uint64_t parent_key, uint64_t ordinal);
uint64_t ew_branch_key_imported(int64_t identifier);

/* ----------------------------------------------------------------------------------------- tables on uniform grids */

/* value[i] at first + i step. Look-ups need no search. */
typedef struct {
  double first;
  double step;
  double inverse_step;
  size_t count;
  double *value;
} ew_table;

/* Allocates `count` >= 2 values from `first` to `last`; the caller fills them and frees with ew_table_clear. */
EW_CHECKED ew_status ew_table_make(ew_table *table, double first, double last, size_t count, ew_error *error);
void ew_table_clear(ew_table *table);

static inline double ew_table_position(const ew_table *table, size_t index) {
  return table->first + (double)index * table->step;
}

/* Linear interpolation; the end values outside the grid. */
static inline double ew_table_at(const ew_table *table, double x) {
  double place = (x - table->first) * table->inverse_step;
  if (!(place > 0.0))
    return table->value[0];
  if (place >= (double)(table->count - 1))
    return table->value[table->count - 1];
  size_t i = (size_t)place;
  double w = place - (double)i;
  return table->value[i] + w * (table->value[i + 1] - table->value[i]);
}

/* ------------------------------------------------------------------------------------------------------ parameters */

/* A parameter is declared once, as a row beside the process that uses it. The engine parses (libconfig files and
 * key=value), validates, prints, echoes in a form that runs again, and knows the range for priors. */

typedef enum {
  EW_REAL,    /* double; integers are accepted */
  EW_INTEGER, /* int64_t */
  EW_FLAG,    /* bool */
  EW_CHOICE,  /* int: index into `choices` */
  EW_TEXT,    /* char[EW_TEXT_SIZE] */
  EW_INTERVAL /* double[2], first <= second, both within [low, high] */
} ew_parameter_type;

enum { EW_TEXT_SIZE = 1024 };

/* One of the named variants of a process; a list ends with a NULL name. */
typedef struct {
  const char *name;
  const char *meaning;
  const char *source;
} ew_choice;

typedef struct {
  const char *name; /* "group.key" */
  ew_parameter_type type;
  size_t offset;        /* of the field within its group's struct */
  const char *unit;     /* "Msun", "1" for pure numbers, "" for names and flags */
  const char *standard; /* the default, as libconfig text: "0.3", "true", "\"grow\"", "[1e8, 3e10]" */
  double low, high;     /* allowed, ends included (numbers only) */
  const ew_choice *choices;
  const char *meaning; /* one sentence */
  const char *source;  /* paper, or "common practice", "own choice", "from memory" */
} ew_parameter;

/* Rows of one struct end with a row without a name. Their number, and a check of the struct's real numbers and choices
 * against them (EW_REFUSED, naming the first at fault) for callers that fill it themselves. */
size_t ew_rows_count(const ew_parameter *rows);
EW_CHECKED ew_status ew_rows_check(const ew_parameter *rows, const void *parameters, ew_error *error);

/* The rows that fill one struct, which lies `offset` bytes into the target. Several groups may share a prefix. */
typedef struct {
  const ew_parameter *rows;
  size_t offset;
} ew_parameter_group;

typedef struct {
  const ew_parameter_group *groups;
  size_t count;
} ew_parameter_table;

/* Where a value came from, for messages: "file.cfg:12", "--set" or "default". */
typedef struct {
  char text[EW_TEXT_SIZE];
} ew_origin;

/* A table with the struct that it fills and the origin of each value (rows counted through all groups in order). */
typedef struct {
  const ew_parameter_table *table;
  void *target;
  ew_origin *origin; /* ew_parameters_count(table) of them */
} ew_parameter_values;

size_t ew_parameters_count(const ew_parameter_table *table);

/* Row `index` counted through all groups. */
const ew_parameter *ew_parameters_row(const ew_parameter_table *table, size_t index);

/* The row of that name (its index through *index unless NULL), or NULL. */
const ew_parameter *ew_parameters_find(const ew_parameter_table *table, const char *name, size_t *index);

/* Binds a table to a target, allocates the origins and sets every default. Release with ew_parameters_close. */
EW_CHECKED ew_status ew_parameters_open(ew_parameter_values *values, const ew_parameter_table *table, void *target,
                                        ew_error *error);
void ew_parameters_close(ew_parameter_values *values);

/* Reads a libconfig file (its @include folder is the file's own). Refuses unknown, duplicate, wrong-typed, out-of-range
 * and not-a-number values with file, line, name, value, what is allowed and the nearest valid name. Later reads win. */
EW_CHECKED ew_status ew_parameters_read(ew_parameter_values *values, const char *path, ew_error *error);

/* The same from text held in memory, e.g. the echo kept in a catalogue; `label` stands for the file in messages. */
EW_CHECKED ew_status ew_parameters_read_text(ew_parameter_values *values, const char *text, const char *label,
                                             ew_error *error);

/* One "group.key=value", value a libconfig scalar or array, or bare text. `label` ("--set") stands in messages. */
EW_CHECKED ew_status ew_parameters_assign(ew_parameter_values *values, const char *assignment, const char *label,
                                          ew_error *error);

/* Refuses the present value of `name` for the reason given (checks between parameters): one line with origin, name and
 * value, then the reason. */
EW_CHECKED ew_status ew_parameters_refuse(const ew_parameter_values *values, const char *name, ew_error *error,
                                          const char *format, ...) EW_FORMAT(4, 5);

/* The whole table as libconfig text that reads back to the same bits; malloc'ed, NULL when memory is short. */
char *ew_parameters_echo(const ew_parameter_values *values);

/* Every parameter for people: name, unit, default, range or choices, meaning, source. */
void ew_parameters_print(const ew_parameter_table *table, FILE *out);

/* -------------------------------------------------------------------------------------------------------- progress */

typedef struct {
  bool shown;       /* false: every call is a no-op */
  const char *what; /* "trees" */
  size_t total;
  double started, last_shown; /* seconds on the monotonic clock */
} ew_progress;

/* Shown on stderr, if that is a terminal and `wanted`. */
ew_progress ew_progress_start(const char *what, size_t total, bool wanted);
void ew_progress_show(ew_progress *progress, size_t done); /* at most ten times a second */
void ew_progress_end(ew_progress *progress);               /* clears the line */
double ew_clock(void);                                     /* seconds on the monotonic clock */

#endif
