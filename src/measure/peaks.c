/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Peaks of the logarithmic histogram: how many by cross-validation over whole
 * traces, where and how sure by a bootstrap over whole traces.
 */
#include <mho/peaks.h>

#include "measure/mixture.h"
#include "measure/sample.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { FIT_BINS_PER_DECADE = 25, P = MHO_FIT_PARAMETERS, G = MHO_GAUSSIAN_PARAMETERS };

#define FWHM_OF_SIGMA 2.3548200450309493 /* 2 sqrt(2 ln 2) */
#define STANDARD_ERRORS 3.0 /* that a further component must gain */

void mho_peak_options_init(mho_peak_options *options)
{
  *options = (mho_peak_options){.low_log10_g0 = NAN, .high_log10_g0 = NAN, .most = 4,
                                .resamples = 400, .prominence = 0.1, .significance = 0.025};
}

typedef struct {
  const mho_peak_options *options;
  mho_sample sample;
  mho_mixture mixture;
  double parameter[P];
  double *work;       /* for one fit */
  double *likelihood; /* [2 * units] of the mixture so far and of a larger one */
} search;

static double fit(const mho_mixture *mixture, const double *count, double *parameter, double *work)
{
  mho_fit_problem problem = mho_mixture_problem(mixture);
  return mho_fit_counts(&problem, count, parameter, work);
}

static double total_of(const double *count, int bins)
{
  double total = 0.0;
  for (int i = 0; i < bins; i++) total += count[i];
  return total;
}

/* The likelihood has several maxima: background may hide in a tail or in the
 * plateau.  The best from here, and from here with the background reset. */
static void refit(const mho_mixture *mixture, const double *count, bool thorough,
                  double *parameter, double *work)
{
  static const double depth[] = {0.3, 0.0, 0.8};
  double start[P], best = fit(mixture, count, parameter, work);
  memcpy(start, parameter, sizeof start);
  for (size_t i = 0; i < (thorough ? sizeof depth / sizeof *depth : 1); i++) {
    double trial[P];
    memcpy(trial, start, sizeof trial);
    for (int k = 0; k < mixture->gaussians; k++) {
      trial[G * k + 3] = trial[G * k] - 1.5;
      trial[G * k + 4] = depth[i];
    }
    double *plateau = trial + G * mixture->gaussians;
    mho_mixture_flat(mixture, 0.3 * total_of(count, mixture->bins), plateau);
    double deviance = fit(mixture, count, trial, work);
    if (!(deviance < best)) continue;
    best = deviance;
    memcpy(parameter, trial, sizeof trial);
  }
}

/* Where the counts exceed the rate most, in units of its noise, within a
 * window of the given half width. */
static double largest_excess(const search *s, const double *rate, double half)
{
  const double *edge = s->sample.edge;
  int bins = s->sample.bins, reach = (int)fmax(1.0, half / (edge[1] - edge[0]));
  double best = -INFINITY, where = edge[0];
  for (int i = 0; i < bins; i++) {
    double excess = 0.0, expected = 0.0;
    for (int j = i - reach; j <= i + reach; j++) {
      if (j < 0 || j >= bins) continue;
      excess += s->sample.total[j] - rate[j];
      expected += rate[j];
    }
    double score = excess / sqrt(expected);
    if (score > best) best = score, where = 0.5 * (edge[i] + edge[i + 1]);
  }
  return where;
}

/* The best mixture with one Gaussian more; false where no fit is finite. */
static bool add_component(const search *s, const mho_mixture *larger, double *parameter)
{
  static const double widths[] = {0.08, 0.2, 0.4};
  int k = s->mixture.gaussians;
  double best = INFINITY;
  mho_fit_problem problem = mho_mixture_problem(&s->mixture);
  double *now = s->work + MHO_FIT_WORK(s->sample.bins, P);
  problem.model(&s->mixture, s->parameter, now, NULL);
  for (size_t w = 0; w < sizeof widths / sizeof *widths; w++) {
    double trial[P];
    memcpy(trial, s->parameter, (size_t)(G * k) * sizeof *trial);
    memcpy(trial + G * (k + 1), s->parameter + G * k, MHO_PLATEAU_PARAMETERS * sizeof *trial);
    trial[G * k] = log(0.1 * total_of(s->sample.total, s->sample.bins) + 1.0);
    trial[G * k + 1] = largest_excess(s, now, widths[w]);
    trial[G * k + 2] = log(widths[w]);
    trial[G * k + 3] = trial[G * k] - 2.0;
    trial[G * k + 4] = 0.3;
    double deviance = fit(larger, s->sample.total, trial, s->work);
    if (!(deviance < best)) continue;
    best = deviance;
    memcpy(parameter, trial, sizeof trial);
  }
  if (isfinite(best)) refit(larger, s->sample.total, true, parameter, s->work);
  return isfinite(best);
}

/* Log likelihood of every unit under the mixture fitted to the other folds. */
static void cross_validate(const search *s, const mho_mixture *mixture, const double *start,
                           double *likelihood)
{
  double *count = s->work + MHO_FIT_WORK(s->sample.bins, P);
  mho_fit_problem problem = mho_mixture_problem(mixture);
  for (size_t fold = 0; fold < MHO_FOLDS; fold++) {
    double parameter[P];
    memcpy(parameter, start, sizeof parameter);
    mho_sample_without_fold(&s->sample, fold, count);
    mho_fit_counts(&problem, count, parameter, s->work);
    problem.model(mixture, parameter, s->work, NULL);
    mho_sample_score(&s->sample, fold, s->work, likelihood);
  }
}

/* Adds Gaussians as long as unseen traces become more likely by it. */
static void choose_mixture(search *s, mho_peaks *peaks)
{
  size_t units = s->sample.units;
  mho_mixture_flat(&s->mixture, total_of(s->sample.total, s->sample.bins), s->parameter);
  fit(&s->mixture, s->sample.total, s->parameter, s->work);
  double *before = s->likelihood, *after = s->likelihood + units;
  cross_validate(s, &s->mixture, s->parameter, before);
  int most = s->options->most < MHO_PEAK_LIMIT ? s->options->most : MHO_PEAK_LIMIT;
  for (int k = 1; k <= most; k++) {
    mho_mixture larger = s->mixture;
    double parameter[P] = {0};
    larger.gaussians = k;
    if (!add_component(s, &larger, parameter)) break;
    cross_validate(s, &larger, parameter, after);
    mho_paired_gain(after, before, units, &peaks->gain[k], &peaks->gain_error[k]);
    if (!(peaks->gain[k] > STANDARD_ERRORS * peaks->gain_error[k])) break;
    s->mixture = larger;
    memcpy(s->parameter, parameter, sizeof parameter);
    memcpy(before, after, units * sizeof *before);
  }
  peaks->components = s->mixture.gaussians;
}

static void refit_resample(const void *mixture, const double *count, double *parameter, double *work)
{
  refit(mixture, count, false, parameter, work);
}

/* First and second half of the traces, each fitted alone. */
static void check_drift(const search *s, int k, double error_of_mean, mho_peak *peak)
{
  double half[2][P], *count = s->work + MHO_FIT_WORK(s->sample.bins, P);
  size_t middle = s->sample.units / 2;
  for (int side = 0; side < 2; side++) {
    memcpy(half[side], s->parameter, sizeof half[side]);
    mho_sample_sum(&s->sample, side ? middle : 0, side ? s->sample.units : middle, count);
    refit(&s->mixture, count, true, half[side], s->work);
  }
  peak->drift_decades = half[1][G * k + 1] - half[0][G * k + 1];
  /* Each half errs sqrt(2) times as much as the whole, their difference 2. */
  double z = fabs(peak->drift_decades) / (2.0 * error_of_mean);
  peak->drift_p = error_of_mean > 0.0 ? erfc(z * 0.70710678118654752440) : 1.0;
}

/* Judges component k; true where it is a peak. */
static bool judge(const search *s, int k, const double *resampled, double *value, mho_peak *peak)
{
  const double *p = s->parameter + G * k;
  int resamples = s->options->resamples, without = 0;
  double all = total_of(s->sample.total, s->sample.bins);
  *peak = (mho_peak){.log10_g0 = p[1], .width_decades = exp(p[2]), .weight = exp(p[0]) / all};
  peak->prominence = mho_mixture_prominence(&s->mixture, s->parameter, k);
  if (peak->prominence < s->options->prominence || FWHM_OF_SIGMA * peak->width_decades >= 1.0)
    return false;
  for (int b = 0; b < resamples; b++) {
    const double *q = resampled + (size_t)b * P;
    value[b] = q[G * k + 1];
    without += !(mho_mixture_prominence(&s->mixture, q, k) > 0.0) ||
               FWHM_OF_SIGMA * exp(q[G * k + 2]) >= 1.0;
  }
  peak->p_value = (double)without / resamples;
  if (peak->p_value > s->options->significance) return false;
  double error_of_mean = mho_deviation(value, (size_t)resamples);
  peak->low = mho_quantile(value, (size_t)resamples, 0.025);
  peak->high = mho_quantile(value, (size_t)resamples, 0.975);
  check_drift(s, k, error_of_mean, peak);
  return true;
}

static int by_height(const void *a, const void *b)
{
  double x = ((const mho_peak *)a)->log10_g0, y = ((const mho_peak *)b)->log10_g0;
  return (x < y) - (x > y);
}

static mho_status judge_all(const search *s, mho_peaks *peaks)
{
  size_t resamples = (size_t)s->options->resamples;
  double *resampled = malloc(resamples * P * sizeof *resampled);
  double *value = malloc(resamples * sizeof *value);
  mho_status status = MHO_ERR_MEMORY;
  if (resampled && value)
    status = mho_sample_bootstrap(&s->sample, s->options->seed, s->options->resamples,
                                  refit_resample, &s->mixture, MHO_FIT_WORK(s->sample.bins, P),
                                  s->parameter, P, resampled);
  for (int k = 0; status == MHO_OK && k < s->mixture.gaussians; k++) {
    mho_peak *peak = &peaks->peak[peaks->count];
    if (!judge(s, k, resampled, value, peak)) continue;
    peak->traces_to_halve = 3 * peaks->traces;
    peaks->count++;
  }
  free(resampled);
  free(value);
  qsort(peaks->peak, (size_t)peaks->count, sizeof *peaks->peak, by_height);
  return status;
}

/* Curves for the figure, per trace and decade. */
static mho_status draw(const search *s, mho_peaks *peaks)
{
  size_t bins = (size_t)s->sample.bins;
  peaks->bins = s->sample.bins;
  peaks->low_log10_g0 = s->sample.edge[0];
  peaks->high_log10_g0 = s->sample.edge[bins];
  peaks->fit = malloc(bins * sizeof(double));
  peaks->background = malloc(bins * sizeof(double));
  peaks->observed = malloc(bins * sizeof(double));
  if (!peaks->fit || !peaks->background || !peaks->observed) return MHO_ERR_MEMORY;
  mho_mixture plateau = {s->mixture.bins, 0, s->mixture.edge};
  mho_fit_problem problem = mho_mixture_problem(&s->mixture);
  problem.model(&s->mixture, s->parameter, peaks->fit, NULL);
  problem.model(&plateau, s->parameter + G * s->mixture.gaussians, peaks->background, NULL);
  double scale = peaks->traces ? 1.0 / (double)peaks->traces : 0.0;
  scale *= (double)bins / (peaks->high_log10_g0 - peaks->low_log10_g0);
  for (size_t i = 0; i < bins; i++) {
    peaks->fit[i] *= scale;
    peaks->background[i] *= scale;
    peaks->observed[i] = s->sample.total[i] * scale;
  }
  return MHO_OK;
}

static mho_status check_options(const mho_peak_options *options, mho_error *error)
{
  if (options->most < 0 || options->most > MHO_PEAK_LIMIT || options->resamples < 40 ||
      options->resamples > 100000)
    return mho_fail(error, MHO_ERR_RANGE, "measure", "peaks",
                    "0 to %d peaks and 40 to 100000 resamples are allowed", MHO_PEAK_LIMIT);
  return MHO_OK;
}

/* Where the window starts: at the floor, or else where a hundredth of the
 * points up to `high` lie below. */
static double lowest(const mho_trace_counts *counts, double high)
{
  if (isfinite(counts->floor_log10_g0)) return fmax(counts->low_log10_g0, counts->floor_log10_g0);
  double all = 0.0, below = 0.0;
  int last = (int)fmin(counts->bins, (high - counts->low_log10_g0) * counts->bins_per_decade), i = 0;
  for (int j = 0; j < last; j++) all += (double)counts->count[j];
  while (i < last && below + (double)counts->count[i] < 0.01 * all) below += (double)counts->count[i++];
  return counts->low_log10_g0 + (double)i / counts->bins_per_decade;
}

mho_status mho_peaks_find(const mho_trace_counts *counts, const mho_peak_options *options,
                          mho_peaks *peaks, mho_error *error)
{
  *peaks = (mho_peaks){.traces = counts->traces};
  double low = options->low_log10_g0, high = options->high_log10_g0;
  if (isnan(high)) high = -0.45; /* below the foot of the contact's peak at G0 */
  if (isnan(low)) low = lowest(counts, high);
  int group = counts->bins_per_decade / FIT_BINS_PER_DECADE;
  search s = {.options = options};
  mho_status status = check_options(options, error);
  if (status != MHO_OK) return status;
  status = mho_sample_init(&s.sample, counts, low, high, group > 1 ? group : 1, 8, error);
  if (status != MHO_OK) return status;
  s.mixture = (mho_mixture){s.sample.bins, 0, s.sample.edge};
  s.work = malloc((MHO_FIT_WORK(s.sample.bins, P) + (size_t)s.sample.bins) * sizeof *s.work);
  s.likelihood = malloc((2 * s.sample.units + 1) * sizeof *s.likelihood);
  if (!s.work || !s.likelihood) status = MHO_ERR_MEMORY;
  if (status == MHO_OK) {
    mho_mixture_flat(&s.mixture, total_of(s.sample.total, s.sample.bins), s.parameter);
    if (s.sample.units >= MHO_UNITS_AT_LEAST) choose_mixture(&s, peaks);
    status = judge_all(&s, peaks);
  }
  if (status == MHO_OK) status = draw(&s, peaks);
  free(s.work);
  free(s.likelihood);
  mho_sample_clear(&s.sample);
  if (status != MHO_OK) {
    mho_peaks_clear(peaks);
    return mho_fail(error, status, "measure", NULL, "out of memory");
  }
  return MHO_OK;
}

void mho_peaks_clear(mho_peaks *peaks)
{
  free(peaks->fit);
  free(peaks->background);
  free(peaks->observed);
  *peaks = (mho_peaks){0};
}
