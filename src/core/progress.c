/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The progress line: done, rate, time left, rewritten in place on a terminal. */
#include "elfinwood/core.h"

#include <time.h>
#include <unistd.h>

#define SHOW_INTERVAL 0.1 /* s */

double ew_clock(void) {
  struct timespec now;
  clock_gettime(CLOCK_MONOTONIC, &now);
  return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

ew_progress ew_progress_start(const char *what, size_t total, bool wanted) {
  double now = ew_clock();
  return (ew_progress){wanted && isatty(STDERR_FILENO), what, total, now, now};
}

void ew_progress_show(ew_progress *progress, size_t done) {
  if (!progress->shown || done == 0)
    return;
  double now = ew_clock();
  if (now - progress->last_shown < SHOW_INTERVAL)
    return;
  progress->last_shown = now;
  double rate = (double)done / (now - progress->started);
  double left = (double)(progress->total - done) / rate;
  fprintf(stderr, "\r%zu of %zu %s, %.1f per second, %.0f s left\033[K", done, progress->total, progress->what, rate,
          left);
  fflush(stderr);
}

void ew_progress_end(ew_progress *progress) {
  if (progress->shown)
    fputs("\r\033[K", stderr);
}
