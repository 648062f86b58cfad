/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <time.h>
#include <unistd.h>

#include "cli/command.h"

#include <mho/study.h>

static volatile int interrupted;

static void on_signal(int number)
{
  (void)number;
  interrupted = 1;
}

static double seconds_now(void)
{
  struct timespec now;
  clock_gettime(CLOCK_MONOTONIC, &now);
  return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

/* A bar on a terminal, once the work has taken a second. */
static void show_progress(int done, int total, const char *step, void *user)
{
  enum { BAR = 24 };
  const double *start = user;
  if (seconds_now() - *start < 1.0) return;
  int filled = total > 0 ? BAR * done / total : 0;
  fprintf(stderr, "\r\033[K[%.*s%.*s] %d/%d %.40s", filled, "########################",
          BAR - filled, "........................", done, total, step);
}

int command_run(const command *cmd, mho_error *error)
{
  if (cmd->files != 1)
    return usage_error(cmd->verb, "%d studies are given; one a run is allowed", cmd->files);
  mho_study *study = NULL;
  mho_status status = mho_study_read(cmd->file[0], &cmd->overrides, &study, error);
  if (status != MHO_OK) return exit_of(status);
  struct sigaction action = {.sa_handler = on_signal};
  sigemptyset(&action.sa_mask);
  sigaction(SIGINT, &action, NULL);
  sigaction(SIGTERM, &action, NULL);
  sigaction(SIGHUP, &action, NULL);
  double start = seconds_now();
  bool bar = !cmd->quiet && isatty(STDERR_FILENO);
  mho_run_options options = {.folder = cmd->output,
                             .command = cmd->line,
                             .progress = bar ? show_progress : NULL,
                             .user = &start,
                             .cancel = &interrupted};
  char *folder = NULL;
  status = mho_study_run(study, &options, &folder, error);
  if (bar) fprintf(stderr, "\r\033[K");
  if (status == MHO_OK && !cmd->quiet) printf("%s/report.html\n", folder);
  free(folder);
  mho_study_free(study);
  return exit_of(status);
}
