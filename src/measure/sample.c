/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "measure/sample.h"

#include "base/processor.h"
#include "base/random.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

mho_status mho_sample_init(mho_sample *sample, const mho_trace_counts *counts, double low,
                           double high, int group, int least, mho_error *error)
{
  *sample = (mho_sample){.units = counts->units};
  double per_decade = counts->bins_per_decade;
  double first = ceil((low - counts->low_log10_g0) * per_decade - 1e-6);
  double last = floor((high - counts->low_log10_g0) * per_decade + 1e-6);
  if (!(first >= 0.0)) first = 0.0;
  if (!(last <= counts->bins)) last = counts->bins;
  int bins = last > first ? (int)(last - first) / group : 0;
  if (bins < least)
    return mho_fail(error, MHO_ERR_RANGE, "measure", "window",
                    "the window from 10^%g to 10^%g G0 holds %d bins of the "
                    "histogram; %d at least are needed", low, high, bins, least);
  sample->bins = bins;
  sample->edge = malloc(((size_t)bins + 1) * sizeof(double));
  sample->total = calloc((size_t)bins, sizeof(double));
  sample->count = calloc((counts->units + 1) * (size_t)bins, sizeof(double));
  if (!sample->edge || !sample->total || !sample->count) {
    mho_sample_clear(sample);
    return mho_fail(error, MHO_ERR_MEMORY, "measure", NULL, "out of memory");
  }
  for (int i = 0; i <= bins; i++)
    sample->edge[i] = counts->low_log10_g0 + (first + i * group) / per_decade;
  for (size_t u = 0; u < counts->units; u++) {
    const uint32_t *from = counts->unit_count + u * (size_t)counts->bins + (size_t)first;
    double *to = sample->count + u * (size_t)bins;
    for (int i = 0; i < bins * group; i++) to[i / group] += from[i];
  }
  mho_sample_sum(sample, 0, sample->units, sample->total);
  return MHO_OK;
}

void mho_sample_clear(mho_sample *sample)
{
  free(sample->edge);
  free(sample->count);
  free(sample->total);
  *sample = (mho_sample){0};
}

FOR_EVERY_PROCESSOR
static void add(const mho_sample *sample, size_t unit, double *count)
{
  int bins = sample->bins;
  const double *from = sample->count + unit * (size_t)bins;
  for (int i = 0; i < bins; i++) count[i] += from[i];
}

static void clear_counts(const mho_sample *sample, double *count)
{
  memset(count, 0, (size_t)sample->bins * sizeof *count);
}

static void draw(const mho_sample *sample, uint64_t seed, uint64_t index, double *count)
{
  mho_random random = mho_random_stream(seed, index);
  clear_counts(sample, count);
  for (size_t i = 0; i < sample->units; i++)
    add(sample, (size_t)mho_random_below(&random, sample->units), count);
}

mho_status mho_sample_bootstrap(const mho_sample *sample, uint64_t seed, int resamples,
                                mho_sample_fit *fit, const void *context, size_t work,
                                const double *parameter, size_t n, double *resampled)
{
  bool failed = false;
#pragma omp parallel reduction(|| : failed)
  {
    double *count = malloc(((size_t)sample->bins + work) * sizeof *count);
    failed = count == NULL;
#pragma omp for schedule(dynamic)
    for (int b = 0; b < resamples; b++) {
      if (!count) continue;
      double *to = resampled + (size_t)b * n;
      memcpy(to, parameter, n * sizeof *to);
      draw(sample, seed, (uint64_t)b, count);
      fit(context, count, to, count + sample->bins);
    }
    free(count);
  }
  return failed ? MHO_ERR_MEMORY : MHO_OK;
}

void mho_sample_sum(const mho_sample *sample, size_t first, size_t last, double *count)
{
  clear_counts(sample, count);
  for (size_t u = first; u < last; u++) add(sample, u, count);
}

void mho_sample_without_fold(const mho_sample *sample, size_t fold, double *count)
{
  clear_counts(sample, count);
  for (size_t u = 0; u < sample->units; u++)
    if (u % MHO_FOLDS != fold) add(sample, u, count);
}

void mho_sample_score(const mho_sample *sample, size_t fold, const double *rate,
                      double *likelihood)
{
  double total = 0.0;
  for (int i = 0; i < sample->bins; i++) total += rate[i];
  for (size_t u = fold; u < sample->units; u += MHO_FOLDS) {
    const double *count = sample->count + u * (size_t)sample->bins;
    double sum = 0.0;
    for (int i = 0; i < sample->bins; i++)
      if (count[i] > 0.0) sum += count[i] * log(rate[i] / total);
    likelihood[u] = sum;
  }
}

void mho_paired_gain(const double *a, const double *b, size_t n, double *mean, double *error)
{
  double sum = 0.0, squares = 0.0;
  for (size_t i = 0; i < n; i++) sum += a[i] - b[i];
  *mean = sum / (double)n;
  for (size_t i = 0; i < n; i++) {
    double d = a[i] - b[i] - *mean;
    squares += d * d;
  }
  *error = sqrt(squares / (double)(n - 1) / (double)n);
}

static int compare(const void *a, const void *b)
{
  double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

double mho_quantile(double *value, size_t n, double q)
{
  qsort(value, n, sizeof *value, compare);
  double at = q * (double)(n - 1);
  size_t i = (size_t)at;
  if (i + 1 >= n) return value[n - 1];
  return value[i] + (at - (double)i) * (value[i + 1] - value[i]);
}

double mho_deviation(const double *value, size_t n)
{
  double mean = 0.0, sum = 0.0;
  for (size_t i = 0; i < n; i++) mean += value[i] / (double)n;
  for (size_t i = 0; i < n; i++) sum += (value[i] - mean) * (value[i] - mean);
  return n > 1 ? sqrt(sum / (double)(n - 1)) : 0.0;
}
