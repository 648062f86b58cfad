/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Batches of candidates: read in turn, computed by all threads, written in the
 * order of the list in one transaction.  A batch grows until it takes about half
 * a second: often enough that little is lost, rarely enough that waiting for
 * the disk costs nothing.  No result depends on its size.
 */
#include <math.h>
#include <omp.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include <mho/molecule_file.h>

#include "base/text.h"
#include "screen/store.h"

enum { BATCH_FIRST = 32, BATCH_MOST = 2048, SAMPLE = 200 };
static const double BATCH_SHORT_S = 0.25, BATCH_LONG_S = 1.0, SAMPLE_S = 3.0;

typedef struct {
  mho_candidate candidate;
  mho_screen_quantities quantities;
  mho_status status; /* MHO_OK, or what ends the work */
  bool done;
} task;

typedef struct {
  const mho_screen_job *job;
  mho_candidates *list;
  int threads;
  mho_screen_workspace **workspace; /* [threads] */
  uint64_t rows; /* of the list */
  int count, size;
  task *task; /* [BATCH_MOST], the first `count` are filled */
} crew;

static mho_status no_memory(mho_error *error)
{
  return mho_fail(error, MHO_ERR_MEMORY, "screen", NULL, "out of memory");
}

static bool cancelled(const mho_screen_job *job) { return job->cancel && *job->cancel; }

static mho_status fail_cancelled(mho_error *error)
{
  return mho_fail(error, MHO_ERR_CANCELLED, "screen", NULL, "interrupted");
}

static double now_s(void)
{
  struct timespec now;
  clock_gettime(CLOCK_MONOTONIC, &now);
  return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

static void crew_free(crew *c)
{
  for (int i = 0; c->workspace && i < c->threads; i++) mho_screen_workspace_free(c->workspace[i]);
  for (int i = 0; c->task && i < BATCH_MOST; i++) mho_candidate_clear(&c->task[i].candidate);
  free(c->workspace);
  free(c->task);
  mho_candidates_close(c->list);
}

static mho_status crew_create(const mho_screen_job *job, crew *c, mho_error *error)
{
  *c = (crew){.job = job, .size = job->even_batches ? BATCH_MOST : BATCH_FIRST,
              .threads = job->threads > 0 ? job->threads : omp_get_max_threads()};
  c->workspace = calloc((size_t)c->threads, sizeof *c->workspace);
  c->task = calloc(BATCH_MOST, sizeof *c->task);
  bool good = c->workspace && c->task;
  for (int i = 0; c->task && i < BATCH_MOST; i++) mho_candidate_init(&c->task[i].candidate);
  for (int i = 0; good && i < c->threads; i++)
    good = (c->workspace[i] = mho_screen_workspace_create()) != NULL;
  if (!good) return no_memory(error);
  return mho_candidates_open(job->list, job->defaults, job->settings, &c->list, error);
}

/* The structure, if the list has it as text; then the quantities.  What fails
 * is the fault of the row, but for memory.  Of a molecule file its SMILES stays. */
static void compute(const crew *all, mho_screen_workspace *workspace, task *t)
{
  mho_candidate *c = &t->candidate;
  const mho_settings *settings = mho_candidates_settings(all->list);
  mho_error own;
  mho_status status = MHO_OK;
  mho_error_init(&own);
  if (!c->fault && c->smiles)
    status = mho_molecule_read_smiles(c->smiles, &c->place, settings, 0, &c->molecule, &own);
  if (!c->fault && status == MHO_OK)
    status = mho_screen_measure(workspace, &c->molecule, &all->job->screen, &t->quantities, &own);
  if (!c->smiles) {
    c->smiles = c->molecule.smiles;
    c->molecule.smiles = NULL;
  }
  mho_molecule_clear(&c->molecule);
  mho_molecule_init(&c->molecule);
  t->status = status == MHO_ERR_MEMORY ? status : MHO_OK;
  if (status != MHO_OK && t->status == MHO_OK) t->status = mho_candidate_fail(c, &own);
  t->done = true;
}

static void compute_batch(crew *c)
{
#pragma omp parallel for schedule(dynamic, 1) num_threads(c->threads)
  for (int i = 0; i < c->count; i++)
    if (!cancelled(c->job)) compute(c, c->workspace[omp_get_thread_num()], &c->task[i]);
}

static mho_status fail_changed(const crew *c, mho_error *error)
{
  return mho_fail_at(error, MHO_ERR_FILE, "screen", c->job->list, 0, 0, NULL,
                     "has changed while it was read");
}

static mho_status read_batch(crew *c, bool *end, mho_error *error)
{
  mho_status status = MHO_OK;
  for (c->count = 0; status == MHO_OK && !*end && c->count < c->size; c->count++) {
    task *t = &c->task[c->count];
    mho_candidate_clear(&t->candidate);
    t->done = false;
    status = mho_candidates_next(c->list, &t->candidate, error);
    *end = t->candidate.row == 0;
    if (*end) break;
    if (t->candidate.row > c->rows) status = fail_changed(c, error);
  }
  return status;
}

/* The first ones that are done, up to the first that ends the work. */
static mho_status write_batch(const crew *c, mho_screen_store *store, mho_screen_counts *counts,
                              mho_error *error)
{
  if (c->count == 0 || !c->task[0].done) return MHO_OK;
  mho_status status = mho_store_begin_batch(store, error), ended = MHO_OK;
  for (int i = 0; status == MHO_OK && ended == MHO_OK && i < c->count && c->task[i].done; i++) {
    ended = c->task[i].status;
    if (ended == MHO_OK)
      status = mho_store_add(store, &c->task[i].candidate, &c->task[i].quantities, error);
  }
  if (status == MHO_OK) status = mho_store_commit(store, error);
  if (status != MHO_OK) return status;
  counts->good = mho_screen_store_counts(store)->good;
  counts->bad = mho_screen_store_counts(store)->bad;
  return ended == MHO_OK ? MHO_OK : no_memory(error);
}

static void report(const mho_screen_job *job, const mho_screen_counts *counts)
{
  if (job->progress) job->progress(counts, job->user);
}

static void resize(crew *c, double taken)
{
  if (taken < BATCH_SHORT_S && 2 * c->size <= BATCH_MOST) c->size *= 2;
  if (taken > BATCH_LONG_S && c->size > c->threads) c->size /= 2;
}

static mho_status run_batches(crew *c, mho_screen_store *store, mho_screen_counts *counts,
                              mho_error *error)
{
  mho_status status = MHO_OK;
  for (bool end = false; status == MHO_OK && !end;) {
    double start = now_s();
    status = read_batch(c, &end, error);
    if (status != MHO_OK) break;
    compute_batch(c);
    status = write_batch(c, store, counts, error);
    double taken = now_s() - start;
    if (!c->job->even_batches) resize(c, taken);
    if (status == MHO_OK) report(c->job, counts);
    bool complete = counts->good + counts->bad == c->rows;
    if (status == MHO_OK && !complete && cancelled(c->job)) status = fail_cancelled(error);
    else if (status == MHO_OK && !complete && end) status = fail_changed(c, error);
  }
  return status;
}

/* A pass over the list for its rows, before anything is computed. */
static mho_status count_rows(const mho_screen_job *job, uint64_t *rows, mho_error *error)
{
  mho_candidates *list;
  mho_status status = mho_candidates_open(job->list, job->defaults, job->settings, &list, error);
  if (status == MHO_OK) status = mho_candidates_skip(list, UINT64_MAX, job->cancel, rows, error);
  mho_candidates_close(list);
  if (status == MHO_OK && *rows == 0)
    status = mho_fail_at(error, MHO_ERR_FILE, "screen", job->list, 0, 0, NULL,
                         "holds no candidates");
  return status;
}

mho_screen_job mho_screen_job_defaults(void)
{
  return (mho_screen_job){.screen = mho_screen_defaults()};
}

mho_status mho_screen_run(const mho_screen_job *job, const char *path, bool resume,
                          mho_screen_counts *counts, mho_error *error)
{
  *counts = (mho_screen_counts){0};
  if (!path[0] || path[0] == ':')
    return mho_fail(error, MHO_ERR_RANGE, "screen", "store", "'%s' is not the name of a file", path);
  crew c;
  mho_meta meta = {0};
  mho_screen_store *store = NULL;
  uint64_t passed;
  mho_status status = crew_create(job, &c, error);
  if (status == MHO_OK) status = count_rows(job, &c.rows, error);
  if (status == MHO_OK) status = mho_meta_of_job(job, c.list, c.rows, &meta, error);
  if (status == MHO_OK) status = mho_store_begin(path, resume, &meta, &store, error);
  if (status == MHO_OK) {
    *counts = *mho_screen_store_counts(store);
    counts->ignored = mho_candidates_ignored(c.list);
    report(job, counts);
    status = mho_candidates_skip(c.list, counts->good + counts->bad, job->cancel, &passed, error);
  }
  if (status == MHO_OK) status = run_batches(&c, store, counts, error);
  mho_screen_store_close(store);
  mho_meta_clear(&meta);
  crew_free(&c);
  return status;
}

/* --- estimate ------------------------------------------------------------- */

enum { PIECES = 10 };

/* Where piece p of the sample begins: the rows p, p + 10, p + 20 ... of it, so
 * that each piece is spread over the list. */
static int piece_start(int wanted, int piece)
{
  int start = 0;
  for (int p = 0; p < piece; p++) start += (wanted - p + PIECES - 1) / PIECES;
  return start;
}

/* Evenly spread rows of the list, the rest passed over. */
static mho_status read_sample(crew *c, uint64_t rows, mho_error *error)
{
  mho_status status = MHO_OK;
  int wanted = rows < SAMPLE ? (int)rows : SAMPLE;
  uint64_t at = 0, passed;
  for (int i = 0; status == MHO_OK && i < wanted; i++) {
    uint64_t next = (uint64_t)i * rows / (uint64_t)wanted; /* from 0 */
    task *t = &c->task[piece_start(wanted, i % PIECES) + i / PIECES];
    status = mho_candidates_skip(c->list, next - at, c->job->cancel, &passed, error);
    if (status == MHO_OK) status = mho_candidates_next(c->list, &t->candidate, error);
    at = next + 1;
  }
  c->count = wanted;
  return status;
}

/* Computes the sample, piece by piece until it has taken long enough; returns
 * the seconds, and the count of the crew is what was computed. */
static double time_sample(crew *c)
{
  task *all = c->task;
  int wanted = c->count, computed = 0;
  double start = now_s(), taken = 0;
  for (int piece = 0; piece < PIECES && (computed == 0 || taken < SAMPLE_S); piece++) {
    int first = piece_start(wanted, piece);
    c->task = all + first;
    c->count = piece_start(wanted, piece + 1) - first;
    compute_batch(c);
    computed = first + c->count;
    taken = now_s() - start;
  }
  c->task = all;
  c->count = computed;
  return taken;
}

/* Bytes a row, from a store in memory. */
static mho_status size_sample(crew *c, const mho_meta *meta, uint64_t rows,
                              mho_screen_estimate *estimate, mho_error *error)
{
  mho_screen_store *store;
  double empty = 0, full = 0;
  mho_screen_counts counts = {0};
  mho_status status = mho_store_begin(":memory:", false, meta, &store, error);
  if (status == MHO_OK) status = mho_store_bytes(store, &empty, error);
  if (status == MHO_OK) status = write_batch(c, store, &counts, error);
  if (status == MHO_OK) status = mho_store_bytes(store, &full, error);
  if (status == MHO_OK) {
    estimate->bytes = empty + (full - empty) * (double)rows / (double)estimate->sample;
    estimate->sample_bad = counts.bad;
  }
  mho_screen_store_close(store);
  return status;
}

mho_status mho_screen_estimate_run(const mho_screen_job *job, mho_screen_estimate *estimate,
                                   mho_error *error)
{
  crew c;
  mho_meta meta = {0};
  *estimate = (mho_screen_estimate){0};
  mho_status status = crew_create(job, &c, error);
  if (status == MHO_OK) status = count_rows(job, &estimate->rows, error);
  if (status == MHO_OK) status = mho_meta_of_job(job, c.list, estimate->rows, &meta, error);
  if (status == MHO_OK) status = read_sample(&c, estimate->rows, error);
  if (status == MHO_OK) {
    double taken = time_sample(&c);
    estimate->ignored = mho_candidates_ignored(c.list);
    estimate->sample = (uint64_t)c.count;
    estimate->seconds = taken * (double)estimate->rows / c.count;
    status = cancelled(job) ? fail_cancelled(error)
                            : size_sample(&c, &meta, estimate->rows, estimate, error);
  }
  mho_meta_clear(&meta);
  crew_free(&c);
  return status;
}
