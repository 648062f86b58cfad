/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "base/text.h"
#include "cli/command.h"

#include <mho/screen_store.h>

int read_goal(command *cmd, const char *text)
{
  char reason[1000];
  cmd->screen.question.has_goal = true;
  if (mho_screen_goal_read(text, &cmd->screen.question.goal, reason, sizeof reason) == MHO_OK)
    return EXIT_DONE;
  return usage_error(cmd->verb, "--goal: %s", reason);
}

int read_require(command *cmd, const char *text)
{
  char reason[1000];
  mho_screening_question *s = &cmd->screen.question;
  if (s->requirements == SCREENING_REQUIREMENTS_MAX)
    return usage_error(cmd->verb, "--require: at most %d are allowed", SCREENING_REQUIREMENTS_MAX);
  if (mho_screen_require_read(text, &s->requirement[s->requirements++], reason, sizeof reason) ==
      MHO_OK)
    return EXIT_DONE;
  return usage_error(cmd->verb, "--require: %s", reason);
}

/* --- looking at a store --------------------------------------------------- */

static mho_status show(const command *cmd, const char *path, mho_error *error)
{
  bool eye = format_of(cmd) == FORMAT_SCREEN;
  mho_screening_view view = {.all = !eye && !cmd->screen.question.has_top,
                             .eye = eye,
                             .width = eye && !cmd->exact ? screen_width_of(cmd) : 0,
                             .remarks = !cmd->quiet};
  mho_output output = {0};
  mho_status status =
      mho_screening_list(&cmd->screen.question, path, &view, &output, NULL, error);
  if (status == MHO_OK) status = output_write(cmd, &output, error);
  mho_output_clear(&output);
  return status;
}

static mho_status list_failed(const command *cmd, const char *path, mho_error *error)
{
  mho_output output = {0};
  mho_status status = mho_screening_failures(path, &output, error);
  const mho_table *table = mho_output_find(&output, "failures");
  if (status == MHO_OK && !cmd->quiet && table && mho_table_rows(table) == 0)
    mho_output_note(&output, "no row is bad");
  if (status == MHO_OK) status = output_write(cmd, &output, error);
  mho_output_clear(&output);
  return status;
}

/* --- computing ------------------------------------------------------------ */

typedef struct {
  const command *cmd;
  double start, drawn;
  bool announced, bar;
  uint64_t before; /* rows that an earlier run has done */
} progress;

static void announce(const progress *p, const mho_screen_counts *counts)
{
  const char *list = p->cmd->file[0];
  fprintf(stderr, "%llu candidates in %s", (unsigned long long)counts->rows, list);
  if (p->before) fprintf(stderr, ", of which %llu are done", (unsigned long long)p->before);
  if (counts->ignored)
    fprintf(stderr, "; %llu other files are passed over", (unsigned long long)counts->ignored);
  fprintf(stderr, "\n");
}

static void on_batch(const mho_screen_counts *counts, void *user)
{
  progress *p = user;
  uint64_t done = counts->good + counts->bad;
  double now = seconds_now();
  if (!p->announced) {
    p->announced = true;
    p->start = now;
    p->before = done;
    if (!p->cmd->quiet) announce(p, counts);
    return;
  }
  if (!p->bar || now - p->start < 1.0 || now - p->drawn < 0.1 || done == p->before) return;
  p->drawn = now;
  double left = (now - p->start) * (double)(counts->rows - done) / (double)(done - p->before);
  draw_bar((double)done / (double)counts->rows, "%llu of %llu, %llu bad, %.0f s left",
           (unsigned long long)done, (unsigned long long)counts->rows,
           (unsigned long long)counts->bad, left);
}

static mho_screen_job job_of(const command *cmd)
{
  const mho_screening_question *s = &cmd->screen.question;
  mho_screen_job job = mho_screen_job_defaults();
  job.list = cmd->file[0];
  job.settings = &cmd->overrides;
  job.screen.window_ev = cmd->window_ev;
  job.screen.sensitivity.seed = cmd->seed;
  job.goal = s->has_goal ? &s->goal : NULL;
  job.requirement = s->requirement;
  job.requirements = (size_t)s->requirements;
  job.cancel = catch_signals();
  return job;
}

static mho_status estimate(const command *cmd, mho_error *error)
{
  mho_screen_job job = job_of(cmd);
  mho_screen_estimate e;
  mho_status status = mho_screen_estimate_run(&job, &e, error);
  if (status != MHO_OK) return status;
  printf("%llu candidates in %s", (unsigned long long)e.rows, job.list);
  if (e.ignored) printf("; %llu other files are passed over", (unsigned long long)e.ignored);
  bool minutes = e.seconds >= 120, hours = e.seconds >= 7200;
  printf("\nabout %.2g %s and %.2g MB, from %llu rows computed just now",
         hours ? e.seconds / 3600 : minutes ? e.seconds / 60 : e.seconds,
         hours ? "hours" : minutes ? "minutes" : "seconds", e.bytes / 1e6,
         (unsigned long long)e.sample);
  if (e.sample_bad) printf(", %llu of them bad", (unsigned long long)e.sample_bad);
  printf("; nothing is written\n");
  return MHO_OK;
}

/* What to type to go on. */
static void tell_resume(const command *cmd, const mho_screen_counts *counts)
{
  unsigned long long done = counts->good + counts->bad;
  fprintf(stderr, "mho screen: %llu of %llu rows are kept in %s; go on with the same command and "
                  "--resume\n", done, (unsigned long long)counts->rows, cmd->screen.store);
}

/* Ranking holds all candidates, and so is left to --show where they are very
 * many; computing them holds a batch. */
enum { SHOW_MOST = 200000 };

static mho_status compute(const command *cmd, mho_error *error)
{
  mho_screen_counts counts;
  progress p = {.cmd = cmd, .bar = !cmd->quiet && isatty(STDERR_FILENO)};
  mho_screen_job job = job_of(cmd);
  job.progress = on_batch;
  job.user = &p;
  mho_status status = mho_screen_run(&job, cmd->screen.store, cmd->screen.resume, &counts, error);
  if (p.drawn > 0) clear_bar();
  if (status != MHO_OK) {
    if (p.announced) tell_resume(cmd, &counts);
    return status;
  }
  if (counts.bad)
    fprintf(stderr, "mho screen: %llu of %llu rows are bad; mho screen %s --failed lists them\n",
            (unsigned long long)counts.bad, (unsigned long long)counts.rows, cmd->screen.store);
  if (counts.good > SHOW_MOST && cmd->format == FORMAT_SCREEN && !cmd->output) {
    printf("%llu candidates are in %s; mho screen %s --show ranks them\n",
           (unsigned long long)counts.good, cmd->screen.store, cmd->screen.store);
    return MHO_OK;
  }
  return show(cmd, cmd->screen.store, error);
}

/* --- the verb ------------------------------------------------------------- */

static bool changes_results(const mho_settings *s)
{
  return s->has_beta || s->has_temperature || s->has_coupling || s->has_fermi || s->has_alternation ||
         s->has_alkyl || s->has_hopping || s->parameters;
}

static int check_looking(const command *cmd)
{
  const screen_options *s = &cmd->screen;
  const char *what = s->show ? "--show" : "--failed";
  if (s->show && s->failed) return usage_error(cmd->verb, "--show and --failed exclude each other");
  if (s->store || s->resume || s->dry_run)
    return usage_error(cmd->verb, "%s looks at a store: mho screen STORE %s, without --store, "
                                  "--resume and --dry-run", what, what);
  if (changes_results(&cmd->overrides) || cmd->has_window)
    return usage_error(cmd->verb, "%s lists what was computed; options of the computation belong to "
                                  "the screening itself", what);
  if (s->failed && (s->question.has_goal || s->question.requirements || s->question.has_top ||
                    s->question.has_seed))
    return usage_error(cmd->verb, "--goal, --require, --top and --seed go with --show");
  return EXIT_DONE;
}

static int check_computing(const command *cmd)
{
  const screen_options *s = &cmd->screen;
  if (!s->store && !s->dry_run)
    return usage_error(cmd->verb, "--store FILE.db is missing; results go there (or --show to look "
                                  "at a store, --dry-run to estimate)");
  return EXIT_DONE;
}

int command_screen(const command *cmd, mho_error *error)
{
  const screen_options *s = &cmd->screen;
  if (cmd->files != 1)
    return usage_error(cmd->verb, "%d lists are given; one is allowed", cmd->files);
  bool looking = s->show || s->failed;
  int code = looking ? check_looking(cmd) : check_computing(cmd);
  if (code != EXIT_DONE) return code;
  if (s->show) return exit_of(show(cmd, cmd->file[0], error));
  if (s->failed) return exit_of(list_failed(cmd, cmd->file[0], error));
  return exit_of(s->dry_run ? estimate(cmd, error) : compute(cmd, error));
}
