/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Idealisation of a signal: averaged down to the bandwidth of the instrument
 * (so that its noise is white), the drift taken off, the number of levels
 * tested on unseen blocks, the most likely path, its dwells.
 */
#include <mho/telegraph.h>

#include "measure/dwell.h"
#include "measure/hmm.h"
#include "measure/sample.h"

#include <math.h>
#include <omp.h>
#include <stdlib.h>
#include <string.h>

enum { BLOCK_POINTS = 16384, BLOCKS_AT_MOST = 48, BLOCKS_WANTED = 20, POINTS_AT_LEAST = 200 };

#define STANDARD_ERRORS 3.0 /* that a further level must gain */

/* Gaussian filter: half of a pulse of this width is left of its height
 * (D. Colquhoun and F. J. Sigworth, in Single-Channel Recording (1983); from
 * memory). */
#define DEAD_TIME_BANDWIDTH 0.179

typedef struct {
  double *g;
  size_t count, capacity;
  size_t *end; /* [traces] index behind each trace */
  size_t traces, trace_capacity;
} signal;

void mho_telegraph_options_init(mho_telegraph_options *options)
{
  *options = (mho_telegraph_options){.most_levels = MHO_LEVEL_LIMIT, .drift = true};
}

static void signal_clear(signal *s)
{
  free(s->g);
  free(s->end);
  *s = (signal){0};
}

static bool signal_reserve(signal *s, size_t more)
{
  if (s->count + more > s->capacity) {
    size_t capacity = 2 * s->capacity > s->count + more ? 2 * s->capacity : s->count + more;
    double *larger = realloc(s->g, capacity * sizeof *larger);
    if (!larger) return false;
    s->g = larger;
    s->capacity = capacity;
  }
  return true;
}

static bool signal_end_trace(signal *s)
{
  if (s->traces == s->trace_capacity) {
    size_t capacity = 2 * s->trace_capacity + 16;
    size_t *larger = realloc(s->end, capacity * sizeof *larger);
    if (!larger) return false;
    s->end = larger;
    s->trace_capacity = capacity;
  }
  s->end[s->traces++] = s->count;
  return true;
}

/* A point that is missing takes the value before it. */
static void append(signal *s, const double *g, size_t n, mho_telegraph *t)
{
  size_t begin = s->traces ? s->end[s->traces - 1] : 0;
  for (size_t i = 0; i < n; i++) {
    double value = g[i];
    if (!isfinite(value)) {
      t->missing++;
      if (s->count == begin) continue; /* nothing before it */
      value = s->g[s->count - 1];
    }
    s->g[s->count++] = value;
  }
}

static mho_status check_options(const mho_telegraph_options *o, mho_error *error)
{
  if (o->most_levels < 1 || o->most_levels > MHO_LEVEL_LIMIT || o->levels < 0 ||
      o->levels > MHO_LEVEL_LIMIT)
    return mho_fail(error, MHO_ERR_RANGE, "measure", "levels", "1 to %d levels are allowed",
                    MHO_LEVEL_LIMIT);
  if (!(o->bandwidth_hz >= 0.0 && isfinite(o->bandwidth_hz)) ||
      !(o->dead_time_s >= 0.0 && isfinite(o->dead_time_s)))
    return mho_fail(error, MHO_ERR_RANGE, "measure", "bandwidth",
                    "bandwidth and dead time must be finite and not negative");
  return MHO_OK;
}

/* Averages so many points that one is left a half period of the bandwidth. */
static void average_down(signal *s, const mho_telegraph_options *options, mho_telegraph *t)
{
  double most = options->bandwidth_hz > 0.0
                    ? floor(0.5 / (options->bandwidth_hz * t->sampling_s) + 1e-9) : 1.0;
  if (!(most >= 2.0)) return;
  size_t group = (size_t)fmin(most, 1e9), to = 0, from = 0;
  for (size_t i = 0; i < s->traces; i++) {
    for (; from + group <= s->end[i]; from += group) {
      double sum = 0.0;
      for (size_t j = 0; j < group; j++) sum += s->g[from + j];
      s->g[to++] = sum / (double)group;
    }
    from = s->end[i];
    s->end[i] = to;
  }
  s->count = to;
  t->sampling_s *= (double)group;
}

/* Slope of the signal in time, with a level of its own for each state where
 * there is a path: within-group regression. */
static double drift_of(const signal *s, const uint8_t *path, double dt)
{
  double n[MHO_LEVEL_LIMIT] = {0}, x[MHO_LEVEL_LIMIT] = {0}, y[MHO_LEVEL_LIMIT] = {0};
  double sxx = 0.0, sxy = 0.0;
  for (int pass = 0; pass < 2; pass++) {
    size_t i = 0;
    for (size_t trace = 0; trace < s->traces; trace++)
      for (size_t begin = i; i < s->end[trace]; i++) {
        int k = path ? path[i] : 0;
        double time = (double)(i - begin) * dt;
        if (pass == 0) {
          n[k]++, x[k] += time, y[k] += s->g[i];
        } else {
          double dx = time - x[k] / n[k];
          sxx += dx * dx;
          sxy += dx * (s->g[i] - y[k] / n[k]);
        }
      }
  }
  return sxx > 0.0 ? sxy / sxx : 0.0;
}

static void take_off(signal *s, double slope, double dt)
{
  size_t i = 0;
  for (size_t trace = 0; trace < s->traces; trace++)
    for (size_t begin = i; i < s->end[trace]; i++) s->g[i] -= slope * (double)(i - begin) * dt;
}

/* Blocks for the estimate: evenly over the signal, none across two traces. */
static mho_status make_blocks(const signal *s, mho_blocks *blocks)
{
  size_t length = s->count / BLOCKS_WANTED, possible = 0;
  if (length > BLOCK_POINTS) length = BLOCK_POINTS;
  if (length < 32) length = 32;
  for (size_t i = 0, begin = 0; i < s->traces; begin = s->end[i++])
    possible += (s->end[i] - begin) / length;
  size_t step = possible / BLOCKS_AT_MOST + 1, seen = 0;
  *blocks = (mho_blocks){.length = length};
  blocks->block = malloc((possible + 1) * sizeof *blocks->block);
  if (!blocks->block) return MHO_ERR_MEMORY;
  for (size_t i = 0, begin = 0; i < s->traces; begin = s->end[i++])
    for (size_t at = begin; at + length <= s->end[i]; at += length)
      if (seen++ % step == 0) blocks->block[blocks->count++] = s->g + at;
  return MHO_OK;
}

/* Each half of the blocks judges a model of the other half.  Two threads with
 * much work each: threads that meet in every round of an estimate spend more
 * on waiting than they save. */
static mho_status unseen_likelihood(const mho_blocks *blocks, int states, double *likelihood)
{
  mho_status status[2];
  int threads = omp_get_max_threads() < 2 ? 1 : 2;
#pragma omp parallel for num_threads(threads)
  for (int parity = 0; parity < 2; parity++) {
    mho_hmm model;
    status[parity] = mho_hmm_estimate(blocks, parity, states, &model);
    if (status[parity] == MHO_OK)
      status[parity] = mho_hmm_score(blocks, 1 - parity, &model, likelihood);
  }
  return status[0] != MHO_OK ? status[0] : status[1];
}

/* A level on which the signal stays for less than three samples on the average
 * is no level but the passage between two others. */
static bool has_passage(const mho_hmm *model)
{
  bool passage = false;
  for (int k = 0; k < model->states; k++) passage |= 1.0 - model->go[k][k] > 1.0 / 3.0;
  return passage;
}

/* The number of levels, and the model with as many. */
static mho_status choose_levels(const mho_blocks *blocks, const mho_telegraph_options *options,
                                mho_telegraph *t, mho_hmm *model)
{
  t->levels = options->levels ? options->levels : 1;
  mho_status status = mho_hmm_estimate(blocks, 2, t->levels, model);
  if (options->levels || blocks->count < 4 || status != MHO_OK) return status;
  double *before = malloc(2 * blocks->count * sizeof *before);
  if (!before) return MHO_ERR_MEMORY;
  double *after = before + blocks->count;
  status = unseen_likelihood(blocks, 1, before);
  for (int k = 2; k <= options->most_levels && status == MHO_OK; k++) {
    status = unseen_likelihood(blocks, k, after);
    if (status != MHO_OK) break;
    mho_paired_gain(after, before, blocks->count, &t->gain[k], &t->gain_error[k]);
    if (!(t->gain[k] > STANDARD_ERRORS * t->gain_error[k])) break;
    mho_hmm larger;
    status = mho_hmm_estimate(blocks, 2, k, &larger);
    if (status != MHO_OK || has_passage(&larger)) break;
    t->levels = k;
    *model = larger;
    memcpy(before, after, blocks->count * sizeof *before);
  }
  free(before);
  return status;
}

/* Samples that a stay must last before the path can show it: its likelihood,
 * (step/noise)^2/2 a point, has to pay for two transitions; with a margin of
 * a half for the scatter of that sum. */
static size_t least_samples(const mho_hmm *m, const mho_telegraph_options *options,
                            mho_telegraph *t)
{
  double dead = options->dead_time_s;
  if (dead == 0.0 && options->bandwidth_hz > 0.0) dead = DEAD_TIME_BANDWIDTH / options->bandwidth_hz;
  double least = ceil(dead / t->sampling_s - 1e-9);
  for (int k = 0; k + 1 < m->states; k++) {
    double z = (m->mean[k + 1] - m->mean[k]) / fmax(m->deviation[k], m->deviation[k + 1]);
    double price = -log(m->go[k][k + 1] * m->go[k + 1][k] / (m->go[k][k] * m->go[k][k]));
    least = fmax(least, fmin(ceil(1.5 * price / (0.5 * z * z)), 1e6));
  }
  least = fmax(least, 2.0);
  /* A stay of t samples is seen in t - 1 to t + 1 of them. */
  t->dead_time_s = m->states > 1 ? (least - 0.5) * t->sampling_s : 0.0;
  return (size_t)least;
}

static void find_paths(const signal *s, const mho_hmm *model, uint8_t *back, uint8_t *path)
{
  for (size_t i = 0, begin = 0; i < s->traces; begin = s->end[i++])
    if (s->end[i] > begin)
      mho_hmm_path(model, s->g + begin, s->end[i] - begin, back, path + begin);
}

/* Model and path; the drift is taken off again with the levels known. */
static mho_status fit_paths(signal *s, const mho_telegraph_options *options, mho_telegraph *t,
                            mho_hmm *model, uint8_t *back, uint8_t *path)
{
  mho_blocks blocks;
  mho_status status = make_blocks(s, &blocks);
  if (status == MHO_OK && blocks.count == 0) status = MHO_ERR_RANGE;
  for (int round = 0; round < 3 && status == MHO_OK; round++) {
    status = choose_levels(&blocks, options, t, model);
    if (status != MHO_OK) break;
    find_paths(s, model, back, path);
    if (!options->drift) break;
    double slope = drift_of(s, path, t->sampling_s);
    take_off(s, slope, t->sampling_s);
    t->drift_g0_per_s += slope;
    double longest = (double)s->count / (double)s->traces * t->sampling_s;
    if (fabs(slope) * longest < 0.02 * model->deviation[0]) break;
  }
  free(blocks.block);
  return status;
}

static mho_status decode(signal *s, const mho_telegraph_options *options, mho_telegraph *t,
                         uint8_t *back, uint8_t *path)
{
  mho_hmm model;
  mho_status status = fit_paths(s, options, t, &model, back, path);
  if (status != MHO_OK) return status;
  size_t least = least_samples(&model, options, t);
  memset(t->level, 0, sizeof t->level);
  for (int k = 0; k < t->levels; k++) t->level[k].noise_g0 = model.deviation[k];
  t->dwells = 0;
  free(t->dwell);
  t->dwell = NULL;
  for (size_t i = 0, begin = 0; i < s->traces && status == MHO_OK; begin = s->end[i++])
    if (s->end[i] > begin)
      status = mho_dwells_add(t, i, path + begin, s->g + begin, s->end[i] - begin, least);
  return status == MHO_OK ? mho_dwells_summarise(t) : status;
}

static mho_status idealise(signal *s, const mho_telegraph_options *options, mho_telegraph *t,
                           mho_error *error)
{
  average_down(s, options, t);
  t->points = s->count;
  if (s->count < POINTS_AT_LEAST)
    return mho_fail(error, MHO_ERR_RANGE, "measure", "points",
                    "%zu points at the bandwidth of the instrument; %d at least are needed",
                    s->count, POINTS_AT_LEAST);
  if (options->drift) {
    t->drift_g0_per_s = drift_of(s, NULL, t->sampling_s);
    take_off(s, t->drift_g0_per_s, t->sampling_s);
  }
  uint8_t *back = malloc(s->count), *path = malloc(s->count);
  mho_status status = back && path ? MHO_OK : MHO_ERR_MEMORY;
  mho_telegraph_options now = *options;
  if (status == MHO_OK) status = decode(s, &now, t, back, path);
  while (status == MHO_ERR_NOT_FINITE && !options->levels && t->levels > 1) {
    now.levels = t->levels - 1; /* a level too short for the resolution */
    status = decode(s, &now, t, back, path);
  }
  free(back);
  free(path);
  if (status == MHO_ERR_RANGE)
    return mho_fail(error, status, "measure", "points", "every trace is too short to be idealised");
  if (status == MHO_ERR_NOT_FINITE)
    return mho_fail(error, MHO_ERR_RANGE, "measure", "levels",
                    "the signal does not stay on each of %d levels; fewer are needed",
                    t->levels);
  return status == MHO_OK ? MHO_OK : mho_fail(error, status, "measure", NULL, "out of memory");
}

mho_status mho_telegraph_idealise(const double *g0, size_t n, double sampling_s,
                                  const mho_telegraph_options *options,
                                  mho_telegraph *telegraph, mho_error *error)
{
  *telegraph = (mho_telegraph){.sampling_s = sampling_s};
  mho_status status = check_options(options, error);
  if (status != MHO_OK) return status;
  if (!(sampling_s > 0.0 && isfinite(sampling_s)))
    return mho_fail(error, MHO_ERR_RANGE, "measure", "sampling", "a positive time is needed");
  signal s = {0};
  if (signal_reserve(&s, n)) {
    append(&s, g0, n, telegraph);
    status = signal_end_trace(&s) ? idealise(&s, options, telegraph, error) : MHO_ERR_MEMORY;
  } else {
    status = mho_fail(error, MHO_ERR_MEMORY, "measure", NULL, "out of memory");
  }
  signal_clear(&s);
  if (status != MHO_OK) mho_telegraph_clear(telegraph);
  return status;
}

/* Sampling time of the first trace that has one. */
typedef struct {
  double first, last;
  size_t count;
} clock_of_trace;

static void watch_clock(clock_of_trace *c, const mho_trace_chunk *chunk, mho_telegraph *t)
{
  if (chunk->first) c->count = 0;
  if (chunk->x && chunk->count > 0) {
    if (c->count == 0) c->first = chunk->x[0];
    c->last = chunk->x[chunk->count - 1];
    c->count += chunk->count;
  }
  if (chunk->last && t->sampling_s == 0.0 && c->count > 1)
    t->sampling_s = (c->last - c->first) / (double)(c->count - 1);
}

static mho_status collect(signal *s, mho_trace_reader *reader, mho_telegraph *t, mho_error *error)
{
  clock_of_trace watch = {0};
  for (;;) {
    mho_trace_chunk chunk;
    bool more;
    mho_status status = mho_trace_reader_next(reader, &chunk, &more, error);
    if (status != MHO_OK || !more) return status;
    if (chunk.first) s->count = s->traces ? s->end[s->traces - 1] : 0; /* drop what failed */
    if (s->count + chunk.count > MHO_TELEGRAPH_POINT_LIMIT)
      return mho_fail(error, MHO_ERR_LIMIT, "measure", "points",
                      "more than %d points; idealise the signal in parts",
                      MHO_TELEGRAPH_POINT_LIMIT);
    watch_clock(&watch, &chunk, t);
    if (!signal_reserve(s, chunk.count))
      return mho_fail(error, MHO_ERR_MEMORY, "measure", NULL, "out of memory");
    append(s, chunk.g0, chunk.count, t);
    if (chunk.last && !signal_end_trace(s))
      return mho_fail(error, MHO_ERR_MEMORY, "measure", NULL, "out of memory");
  }
}

mho_status mho_telegraph_read(const char *const *paths, size_t count,
                              const mho_trace_options *traces,
                              const mho_telegraph_options *options, mho_telegraph *telegraph,
                              mho_error *error)
{
  *telegraph = (mho_telegraph){0};
  mho_status status = check_options(options, error);
  if (status != MHO_OK) return status;
  mho_trace_reader *reader;
  status = mho_trace_reader_create(paths, count, traces, MHO_ABSCISSA_TIME, &reader, error);
  if (status != MHO_OK) return status;
  signal s = {0};
  status = collect(&s, reader, telegraph, error);
  telegraph->report = *mho_trace_reader_report(reader);
  mho_trace_reader_free(reader);
  if (status == MHO_OK) {
    s.count = s.traces ? s.end[s.traces - 1] : 0; /* what a failed file left */
    if (!(telegraph->sampling_s > 0.0))
      status = mho_fail(error, MHO_ERR_RANGE, "measure", "sampling",
                        "no ascending time; a column time_s or the sampling rate is needed");
    else
      status = idealise(&s, options, telegraph, error);
  }
  signal_clear(&s);
  if (status != MHO_OK) mho_telegraph_clear(telegraph);
  return status;
}

void mho_telegraph_clear(mho_telegraph *telegraph)
{
  free(telegraph->dwell);
  *telegraph = (mho_telegraph){0};
}

double mho_telegraph_spectrum(double step, double tau1_s, double tau2_s, double frequency_hz)
{
  double rate = 1.0 / tau1_s + 1.0 / tau2_s, omega = 6.28318530717958647693 * frequency_hz;
  return 4.0 * step * step / ((tau1_s + tau2_s) * (rate * rate + omega * omega));
}
