/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * For end-to-end tests: the program in a temporary folder, its exit status and what it printed. */
#ifndef EW_TESTS_PROGRAM_H
#define EW_TESTS_PROGRAM_H

#include "look.h"

#include <fcntl.h>
#include <signal.h>
#include <sys/resource.h>
#include <sys/wait.h>
#include <time.h>

/* Small enough for a tenth of a second. */
#define PROGRAM_SMALL                                                                                                  \
  "roots: { kind = \"range\"; mass_range = [1e8, 1e9]; count = 6; };\n"                                                \
  "trees: { resolution_mass = 1e6; };\n"                                                                               \
  "ensemble: { realizations = 2; };\n"

enum { PROGRAM_MOST_WORDS = 24 };

/* How to start it; zeroed parts mean the usual. */
typedef struct {
  look_path folder;            /* where it runs */
  rlim_t largest_file;         /* bytes; 0: no limit */
  const char *standard_output; /* NULL: "stdout" in the folder; "": closed */
} program_place;

typedef struct {
  int status; /* exit status, or 128 + signal */
  char *out, *err;
} program_result;

static inline void program_redirect(int stream, look_path path) {
  int descriptor = open(path.path, O_WRONLY | O_CREAT | O_TRUNC, 0666);
  if (descriptor < 0 || dup2(descriptor, stream) < 0)
    _exit(120);
  close(descriptor);
}

/* To a device, or nowhere. */
static inline void program_send_output(const char *device) {
  look_path path;
  snprintf(path.path, sizeof path.path, "%s", device);
  if (*device)
    program_redirect(STDOUT_FILENO, path);
  else
    close(STDOUT_FILENO);
}

/* In the child: never returns. `line` is split at blanks. */
static inline void program_become(const program_place *place, const char *line) {
  char copy[4096];
  char *words[PROGRAM_MOST_WORDS + 2] = {copy};
  size_t count = 1;
  snprintf(copy, sizeof copy, "elfinwood %s", line);
  strtok(copy, " ");
  while (count <= PROGRAM_MOST_WORDS && (words[count] = strtok(NULL, " ")))
    count++;
  const struct rlimit limit = {place->largest_file, place->largest_file};
  if (chdir(place->folder.path) != 0)
    _exit(121);
  program_redirect(STDERR_FILENO, look_join(place->folder, "stderr"));
  if (!place->standard_output)
    program_redirect(STDOUT_FILENO, look_join(place->folder, "stdout"));
  else
    program_send_output(place->standard_output);
  if (place->largest_file > 0 && setrlimit(RLIMIT_FSIZE, &limit) != 0)
    _exit(122);
  execv(EW_PROGRAM, words);
  _exit(123);
}

static inline pid_t program_start(const program_place *place, const char *line) {
  pid_t child = fork();
  assert_true(child >= 0);
  if (child == 0)
    program_become(place, line);
  return child;
}

static inline program_result program_wait(const program_place *place, pid_t child) {
  int status;
  assert_int_equal(waitpid(child, &status, 0), child);
  char *out = place->standard_output ? calloc(1, 1) : look_read_text(look_join(place->folder, "stdout"));
  char *err = look_read_text(look_join(place->folder, "stderr"));
  assert_non_null(out);
  return (program_result){WIFEXITED(status) ? WEXITSTATUS(status) : 128 + WTERMSIG(status), out, err};
}

static inline program_result program_run_at(const program_place *place, const char *line) {
  return program_wait(place, program_start(place, line));
}

static inline void program_forget(program_result result) {
  free(result.out);
  free(result.err);
}

/* One line that starts with the program's name and holds `part`. */
static inline void program_assert_complaint(const program_result *result, int status, const char *part) {
  size_t length = strlen(result->err);
  bool one_line = length > 0 && strchr(result->err, '\n') == result->err + length - 1;
  if (result->status != status || !one_line || strncmp(result->err, "elfinwood: ", 11) != 0 ||
      !strstr(result->err, part))
    fail_msg("expected status %d and one line with \"%s\", got %d and:\n%s", status, part, result->status, result->err);
}

/* Runs in the folder, fails with that status, and complains in one line that holds `part`. */
static inline void program_assert_fails(look_path folder, const char *line, int status, const char *part) {
  const program_place place = {.folder = folder};
  program_result result = program_run_at(&place, line);
  program_assert_complaint(&result, status, part);
  assert_string_equal(result.out, "");
  program_forget(result);
}

/* Runs in the folder and succeeds without a word on stderr; what it printed: free it. */
static inline char *program_assert_succeeds(look_path folder, const char *line) {
  const program_place place = {.folder = folder};
  program_result result = program_run_at(&place, line);
  if (result.status != 0 || *result.err)
    fail_msg("\"%s\" ended with status %d:\n%s", line, result.status, result.err);
  free(result.err);
  return result.out;
}

static inline void program_run(look_path folder, const char *line) {
  free(program_assert_succeeds(folder, line));
}

static inline void program_assert_prints(look_path folder, const char *line, const char *part) {
  char *out = program_assert_succeeds(folder, line);
  assert_non_null(out);
  if (!strstr(out, part))
    fail_msg("\"%s\" printed no \"%s\":\n%s", line, part, out);
  free(out);
}

static inline void program_sleep(double seconds) {
  struct timespec span = {(time_t)seconds, (long)(1e9 * (seconds - (double)(time_t)seconds))};
  nanosleep(&span, NULL);
}

#endif
