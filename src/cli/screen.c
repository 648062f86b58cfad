/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "base/text.h"
#include "cli/command.h"
#include "report/stages.h"

#include <mho/screen_store.h>

int read_goal(command *cmd, const char *text)
{
  char reason[1000];
  cmd->screen.has_goal = true;
  if (mho_screen_goal_read(text, &cmd->screen.goal, reason, sizeof reason) == MHO_OK)
    return EXIT_DONE;
  return usage_error(cmd->verb, "--goal: %s", reason);
}

int read_require(command *cmd, const char *text)
{
  char reason[1000];
  screen_options *s = &cmd->screen;
  const int most = sizeof s->requirement / sizeof *s->requirement;
  if (s->requirements == most)
    return usage_error(cmd->verb, "--require: at most %d are allowed", most);
  if (mho_screen_require_read(text, &s->requirement[s->requirements++], reason, sizeof reason) ==
      MHO_OK)
    return EXIT_DONE;
  return usage_error(cmd->verb, "--require: %s", reason);
}

/* --- looking at a store --------------------------------------------------- */

/* What is wanted: options first, then what the store was made for. */
typedef struct {
  mho_screen_rank_options rank;
  mho_screen_requirement requirement[32];
} aims;

static mho_status read_stored_requirements(const char *text, aims *a, char *reason, size_t size)
{
  mho_status status = MHO_OK;
  const size_t most = sizeof a->requirement / sizeof *a->requirement;
  while (status == MHO_OK && *text && a->rank.requirements < most) {
    size_t length = strcspn(text, ";");
    char *one = mho_print_text("%.*s", (int)length, text);
    if (!one) return MHO_ERR_MEMORY;
    status = mho_screen_require_read(one, &a->requirement[a->rank.requirements++], reason, size);
    free(one);
    text += length + (text[length] == ';');
  }
  return status;
}

static mho_status find_aims(const command *cmd, const mho_screen_store *store, const char *path,
                            aims *a, mho_error *error)
{
  const screen_options *s = &cmd->screen;
  char reason[1000] = "";
  mho_status status = MHO_OK;
  const char *goal = mho_screen_store_meta(store, "goal");
  const char *require = mho_screen_store_meta(store, "require");
  const char *seed = mho_screen_store_meta(store, "seed");
  *a = (aims){.rank = mho_screen_rank_defaults()};
  if (s->has_goal) a->rank.goal = s->goal;
  else if (goal) status = mho_screen_goal_read(goal, &a->rank.goal, reason, sizeof reason);
  if (s->requirements > 0) {
    memcpy(a->requirement, s->requirement, sizeof a->requirement);
    a->rank.requirements = (size_t)s->requirements;
  } else if (status == MHO_OK && require) {
    status = read_stored_requirements(require, a, reason, sizeof reason);
  }
  a->rank.requirement = a->requirement;
  if (seed) a->rank.seed = strtoull(seed, NULL, 10);
  if (s->has_top) a->rank.top = (size_t)s->top;
  if (status == MHO_OK) return MHO_OK;
  return mho_fail_at(error, MHO_ERR_RANGE, "cli", path, 0, 0, NULL, "is damaged: %s", reason);
}

/* Candidates by rank; those without one are left out. */
static size_t *sort_places(const mho_screen_place *place, size_t count, size_t ranked)
{
  size_t *order = calloc(ranked + 1, sizeof *order);
  for (size_t i = 0; order && i < count; i++)
    if (place[i].rank >= 1 && place[i].rank <= ranked) order[place[i].rank - 1] = i;
  return order;
}

typedef struct {
  mho_screen_store *store;
  aims aims;
  mho_screen_quantities *quantities;
  uint64_t *row;
  mho_screen_place *place;
  size_t count, *order;
  mho_screen_ranking ranking;
} shelf;

static mho_status load(const command *cmd, const char *path, shelf *sh, mho_error *error)
{
  mho_status status = find_aims(cmd, sh->store, path, &sh->aims, error);
  if (status == MHO_OK)
    status = mho_screen_store_load(sh->store, &sh->quantities, &sh->row, &sh->count, error);
  if (status != MHO_OK) return status;
  sh->place = calloc(sh->count + 1, sizeof *sh->place);
  if (!sh->place) return mho_fail(error, MHO_ERR_MEMORY, "cli", NULL, "out of memory");
  status = mho_screen_rank(sh->quantities, sh->count, &sh->aims.rank, sh->place, &sh->ranking, error);
  if (status != MHO_OK) return status;
  sh->order = sort_places(sh->place, sh->count, sh->ranking.ranked);
  return sh->order ? MHO_OK : mho_fail(error, MHO_ERR_MEMORY, "cli", NULL, "out of memory");
}

static mho_status list_places(const command *cmd, const shelf *sh, mho_output *output,
                              mho_error *error)
{
  bool eye = format_of(cmd) == FORMAT_SCREEN;
  int width = eye && !cmd->exact ? screen_width_of(cmd) : 0;
  size_t shown = sh->ranking.ranked;
  if (cmd->screen.has_top || eye)
    shown = shown < sh->aims.rank.top ? shown : sh->aims.rank.top;
  unsigned warnings = 0;
  mho_status status = MHO_OK;
  mho_table *table = mho_screening_table(output, width);
  for (size_t i = 0; status == MHO_OK && i < shown; i++) {
    size_t at = sh->order[i];
    mho_screen_text text;
    status = mho_screen_store_candidate(sh->store, sh->row[at], &text, error);
    if (status != MHO_OK) break;
    mho_screening_row(table, width, &text, &sh->place[at], &sh->quantities[at]);
    if (!eye) mho_output_warn(output, text.name, (unsigned)sh->quantities[at].warnings);
    warnings |= (unsigned)sh->quantities[at].warnings;
  }
  if (cmd->quiet || status != MHO_OK) return status;
  if (shown < sh->ranking.ranked)
    mho_output_note(output, "the first %zu of %zu; --top N lists more, --csv all", shown,
                    sh->ranking.ranked);
  mho_screening_note(output, &sh->aims.rank, &sh->ranking, eye ? warnings : 0);
  mho_screening_state_note(output, mho_screen_store_counts(sh->store));
  return MHO_OK;
}

static mho_status show(const command *cmd, const char *path, mho_error *error)
{
  shelf sh = {0};
  mho_output output = {0};
  mho_status status = mho_screen_store_open(path, &sh.store, error);
  if (status == MHO_OK) status = load(cmd, path, &sh, error);
  if (status == MHO_OK) status = list_places(cmd, &sh, &output, error);
  if (status == MHO_OK) status = output_write(cmd, &output, error);
  mho_output_clear(&output);
  free(sh.quantities);
  free(sh.row);
  free(sh.place);
  free(sh.order);
  mho_screen_store_close(sh.store);
  return status;
}

static mho_status list_failed(const command *cmd, const char *path, mho_error *error)
{
  mho_screen_store *store;
  mho_output output = {0};
  mho_screen_text text = {0};
  mho_status status = mho_screen_store_open(path, &store, error);
  mho_table *table = mho_failures_table(&output);
  while (status == MHO_OK) {
    status = mho_screen_store_failure(store, text.row, &text, error);
    if (status != MHO_OK || !text.row) break;
    mho_failures_row(table, &text);
  }
  if (status == MHO_OK && !cmd->quiet && mho_table_rows(table) == 0)
    mho_output_note(&output, "no row is bad");
  if (status == MHO_OK) status = output_write(cmd, &output, error);
  mho_output_clear(&output);
  mho_screen_store_close(store);
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
  const screen_options *s = &cmd->screen;
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
  if (s->failed && (s->has_goal || s->requirements || s->has_top))
    return usage_error(cmd->verb, "--goal, --require and --top go with --show");
  return EXIT_DONE;
}

static int check_computing(const command *cmd)
{
  const screen_options *s = &cmd->screen;
  if (s->dry_run && (s->store || s->resume))
    return usage_error(cmd->verb, "--dry-run writes nothing; it excludes --store and --resume");
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
