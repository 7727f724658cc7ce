/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Stopping: the signals that ask for it, and what is told when a job did not finish. */
#include "cli/cli.h"

#include <string.h>

/* A signal handler can reach nothing else. */
static volatile sig_atomic_t stop_wanted;

static void want_stop(int signal_number) {
  (void)signal_number;
  stop_wanted = 1;
}

const volatile sig_atomic_t *ew_stop_flag(void) {
  return &stop_wanted;
}

void ew_stop_on_signals(void) {
  struct sigaction action = {.sa_handler = want_stop};
  action.sa_flags = (int)SA_RESETHAND | SA_RESTART;
  sigemptyset(&action.sa_mask);
  sigaction(SIGINT, &action, NULL);
  sigaction(SIGTERM, &action, NULL);
}

ew_status ew_fail_unfinished(const ew_error *failure, const char *output, uint64_t kept, uint64_t total,
                             ew_error *error) {
  unsigned long long there = kept, wanted = total;
  if (stop_wanted && strcmp(failure->message, EW_INTERRUPTED) == 0)
    return ew_fail(error, EW_FAILED, "interrupted after %llu of %llu trees; kept in %s.partial", there, wanted, output);
  return ew_fail(error, failure->status, "%s; %llu of %llu trees kept in %s.partial", failure->message, there, wanted,
                 output);
}
