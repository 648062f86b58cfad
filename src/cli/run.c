/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <stdio.h>
#include <stdlib.h>
#include <unistd.h>

#include "cli/command.h"

#include <mho/study.h>

typedef struct {
  double start;
  bool bar;
} display;

/* A bar on a terminal, once the work has taken a second. */
static void show_progress(int done, int total, const char *step, void *user)
{
  const display *d = user;
  if (seconds_now() - d->start < 1.0) return;
  draw_bar(total > 0 ? (double)done / total : 0, "%d/%d %.40s", done, total, step);
}

static void print_answer(const char *sentence, void *user)
{
  const display *d = user;
  if (d->bar) clear_bar();
  printf("%s\n", sentence);
}

int command_run(const command *cmd, mho_error *error)
{
  if (cmd->files != 1)
    return usage_error(cmd->verb, "%d studies are given; one a run is allowed", cmd->files);
  mho_study *study = NULL;
  mho_status status = mho_study_read(cmd->file[0], &cmd->overrides, &study, error);
  if (status != MHO_OK) return exit_of(status);
  display d = {.start = seconds_now(), .bar = !cmd->quiet && isatty(STDERR_FILENO)};
  mho_run_options options = {.folder = cmd->output,
                             .command = cmd->line,
                             .progress = d.bar ? show_progress : NULL,
                             .answer = cmd->quiet ? NULL : print_answer,
                             .user = &d,
                             .cancel = catch_signals()};
  char *folder = NULL;
  status = mho_study_run(study, &options, &folder, error);
  if (d.bar) clear_bar();
  if (status == MHO_OK && !cmd->quiet) printf("%s/report.html\n", folder);
  free(folder);
  mho_study_free(study);
  return exit_of(status);
}
