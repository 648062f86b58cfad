/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Power of the noise in a band by Welch's method (P. D. Welch, IEEE Trans.
 * Audio Electroacoust. 15, 70 (1967)): Hann windows that overlap by half,
 * each without its mean.
 */
#include <mho/telegraph.h>

#include "base/random.h"
#include "measure/sample.h"

#include <gsl/gsl_fft_real.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { JUNCTION_LIMIT = 1000000, POINTS_LIMIT = 1 << 22, LEAST_JUNCTIONS = 10 };

#define TWO_PI 6.28318530717958647693

typedef struct {
  double *g, *work;
  size_t count, capacity;
  double first_s, last_s;
  bool bad;
} junction;

void mho_flicker_options_init(mho_flicker_options *options)
{
  *options = (mho_flicker_options){.low_hz = 100.0, .high_hz = 1000.0, .resamples = 400};
}

static bool add_points(junction *j, const mho_trace_chunk *chunk)
{
  if (chunk->first) j->count = 0, j->bad = false;
  if (j->count + chunk->count > POINTS_LIMIT) j->bad = true;
  if (chunk->count == 0 || j->bad) return true;
  if (chunk->abscissa != MHO_ABSCISSA_TIME) j->bad = true;
  if (j->count + chunk->count > j->capacity) {
    size_t capacity = 2 * (j->count + chunk->count);
    double *g = realloc(j->g, capacity * sizeof *g);
    if (g) j->g = g;
    double *work = realloc(j->work, capacity * sizeof *work);
    if (work) j->work = work;
    if (!g || !work) return false;
    j->capacity = capacity;
  }
  memcpy(j->g + j->count, chunk->g0, chunk->count * sizeof *j->g);
  if (chunk->x) {
    if (j->count == 0) j->first_s = chunk->x[0];
    j->last_s = chunk->x[chunk->count - 1];
  }
  j->count += chunk->count;
  return true;
}

/* Power between the two frequencies; false where the sampling does not allow
 * it. */
static bool band_power(const junction *j, const mho_flicker_options *o, double *mean_g0,
                       double *power)
{
  if (j->bad || j->count < 16) return false;
  double dt = (j->last_s - j->first_s) / (double)(j->count - 1), mean = 0.0;
  if (!(dt > 0.0) || o->high_hz > 0.5 / dt) return false;
  size_t length = 16;
  while (1.0 / ((double)length * dt) > 0.25 * o->low_hz && 2 * length <= j->count) length *= 2;
  double bin_hz = 1.0 / ((double)length * dt);
  if (bin_hz > o->low_hz) return false;
  for (size_t i = 0; i < j->count; i++) mean += j->g[i] / (double)j->count;
  if (!(mean > 0.0)) return false; /* NaN too */
  double sum = 0.0;
  size_t segments = 0;
  for (size_t start = 0; start + length <= j->count; start += length / 2, segments++) {
    double local = 0.0;
    for (size_t i = 0; i < length; i++) local += j->g[start + i] / (double)length;
    for (size_t i = 0; i < length; i++)
      j->work[i] = (j->g[start + i] - local) *
                   (0.5 - 0.5 * cos(TWO_PI * (double)i / (double)length));
    gsl_fft_real_radix2_transform(j->work, 1, length);
    for (size_t k = 1; k < length / 2; k++) {
      double f = (double)k * bin_hz;
      if (f < o->low_hz || f > o->high_hz) continue;
      sum += j->work[k] * j->work[k] + j->work[length - k] * j->work[length - k];
    }
  }
  /* 3/8 is the mean square of Hann's window. */
  *power = 2.0 * dt / ((double)length * 0.375) * bin_hz * sum / (double)segments;
  *mean_g0 = mean;
  return *power > 0.0;
}

static bool keep(mho_flicker *f, double mean_g0, double power)
{
  size_t n = f->junctions;
  if (n == JUNCTION_LIMIT) {
    f->unusable++;
    return true;
  }
  if ((n & (n - 1)) == 0) { /* full at powers of two */
    size_t capacity = n ? 2 * n : 1;
    double *g = realloc(f->conductance_g0, capacity * sizeof *g);
    if (g) f->conductance_g0 = g;
    double *p = realloc(f->noise_g0_squared, capacity * sizeof *p);
    if (p) f->noise_g0_squared = p;
    if (!g || !p) return false;
  }
  f->conductance_g0[n] = mean_g0;
  f->noise_g0_squared[n] = power;
  f->junctions++;
  return true;
}

/* P/G^n does not depend on G where n is the slope of log P on log G; the
 * junctions are drawn by `random`, or taken each once. */
static double slope(const mho_flicker *f, mho_random *random)
{
  double sx = 0.0, sy = 0.0, sxx = 0.0, sxy = 0.0, n = (double)f->junctions;
  for (size_t i = 0; i < f->junctions; i++) {
    size_t j = random ? (size_t)mho_random_below(random, f->junctions) : i;
    double x = log10(f->conductance_g0[j]), y = log10(f->noise_g0_squared[j]);
    sx += x, sy += y, sxx += x * x, sxy += x * y;
  }
  return (n * sxy - sx * sy) / (n * sxx - sx * sx);
}

static mho_status judge(mho_flicker *f, const mho_flicker_options *o, mho_error *error)
{
  f->exponent = f->low = f->high = NAN;
  if (f->junctions < LEAST_JUNCTIONS) return MHO_OK;
  double *value = malloc((size_t)o->resamples * sizeof *value);
  if (!value) return mho_fail(error, MHO_ERR_MEMORY, "measure", NULL, "out of memory");
  f->exponent = slope(f, NULL);
  for (int b = 0; b < o->resamples; b++) {
    mho_random random = mho_random_stream(o->seed, (uint64_t)b);
    value[b] = slope(f, &random);
  }
  f->low = mho_quantile(value, (size_t)o->resamples, 0.025);
  f->high = mho_quantile(value, (size_t)o->resamples, 0.975);
  free(value);
  if (!isfinite(f->exponent)) f->exponent = f->low = f->high = NAN; /* one conductance */
  return MHO_OK;
}

static mho_status collect(mho_flicker *f, mho_trace_reader *reader, junction *j,
                          const mho_flicker_options *options, mho_error *error)
{
  for (;;) {
    mho_trace_chunk chunk;
    bool more;
    mho_status status = mho_trace_reader_next(reader, &chunk, &more, error);
    if (status != MHO_OK || !more) return status;
    bool good = add_points(j, &chunk);
    double mean_g0, power;
    if (good && chunk.last) {
      if (band_power(j, options, &mean_g0, &power)) good = keep(f, mean_g0, power);
      else f->unusable++;
    }
    if (!good) return mho_fail(error, MHO_ERR_MEMORY, "measure", NULL, "out of memory");
  }
}

mho_status mho_flicker_read(const char *const *paths, size_t count,
                            const mho_trace_options *traces, const mho_flicker_options *options,
                            mho_flicker *flicker, mho_error *error)
{
  *flicker = (mho_flicker){0};
  if (!(options->low_hz > 0.0 && options->low_hz < options->high_hz) ||
      options->resamples < 40 || options->resamples > 100000)
    return mho_fail(error, MHO_ERR_RANGE, "measure", "band",
                    "a band of positive frequencies and 40 to 100000 resamples are allowed");
  mho_trace_reader *reader;
  mho_status status =
      mho_trace_reader_create(paths, count, traces, MHO_ABSCISSA_TIME, &reader, error);
  if (status != MHO_OK) return status;
  junction j = {0};
  status = collect(flicker, reader, &j, options, error);
  flicker->report = *mho_trace_reader_report(reader);
  mho_trace_reader_free(reader);
  free(j.g);
  free(j.work);
  if (status == MHO_OK) status = judge(flicker, options, error);
  if (status != MHO_OK) mho_flicker_clear(flicker);
  return status;
}

void mho_flicker_clear(mho_flicker *flicker)
{
  free(flicker->conductance_g0);
  free(flicker->noise_g0_squared);
  *flicker = (mho_flicker){0};
}
