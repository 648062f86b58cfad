/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Mean dwells.  With a resolution tau a visible dwell on level 1 starts with
 * one of at least tau and goes on through every stay on level 2 that is
 * shorter.  Exponential dwells of rates k1, k2 then last, on the average,
 *   m1 = tau + 1/k1 + q2/(1 - q2) (E[t2 | t2 < tau] + 1/k1),
 *   q2 = 1 - exp(-k2 tau),
 * and the same with 1 and 2 exchanged; solved here for k1 and k2.  (The
 * problem of missed events: D. Colquhoun and F. J. Sigworth, in
 * Single-Channel Recording (1983); the sums above are ours.)
 */
#include "measure/dwell.h"

#include "base/random.h"

#include <gsl/gsl_cdf.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { TEST_DWELLS = 1000, TEST_DRAWS = 400, TEST_AT_LEAST = 8 };

static bool push(mho_telegraph *t, const mho_dwell *dwell)
{
  size_t n = t->dwells;
  if ((n & (n - 1)) == 0) { /* full at powers of two */
    mho_dwell *larger = realloc(t->dwell, (n ? 2 * n : 1) * sizeof *larger);
    if (!larger) return false;
    t->dwell = larger;
  }
  t->dwell[t->dwells++] = *dwell;
  return true;
}

/* Mean of the points that lie on the level, without the first and last of
 * every stay, where the instrument is on its way; NaN where none is left. */
static double mean_on_level(const uint8_t *path, const double *signal, size_t from, size_t to,
                            int level)
{
  double sum = 0.0;
  size_t count = 0;
  for (size_t i = from + 1; i + 1 < to; i++) {
    if (path[i] != level || path[i - 1] != level || path[i + 1] != level) continue;
    sum += signal[i];
    count++;
  }
  return count ? sum / (double)count : NAN;
}

mho_status mho_dwells_add(mho_telegraph *telegraph, uint64_t trace, const uint8_t *path,
                          const double *signal, size_t n, size_t least)
{
  double dt = telegraph->sampling_s;
  size_t start = 0, run = 0;
  int level = -1; /* of the dwell that started at `start` */
  for (size_t i = 1; i <= n; i++) {
    if (i < n && path[i] == path[i - 1]) continue;
    bool seen = i - run >= least; /* the run ends here */
    if (level < 0 && (seen || i == n)) level = path[i - 1];
    else if (seen && path[i - 1] != level) {
      mho_dwell dwell = {trace, level, (double)start * dt, (double)(run - start) * dt,
                         mean_on_level(path, signal, start, run, level), start == 0};
      if (!push(telegraph, &dwell)) return MHO_ERR_MEMORY;
      start = run;
      level = path[i - 1];
    }
    run = i;
  }
  mho_dwell last = {trace, level, (double)start * dt, (double)(n - start) * dt,
                    mean_on_level(path, signal, start, n, level), true};
  return push(telegraph, &last) ? MHO_OK : MHO_ERR_MEMORY;
}

/* Mean and standard error of a level over its dwells, weighted by length. */
static double level_mean(const mho_telegraph *t, int level, double *error, double *freedom)
{
  double weight = 0.0, sum = 0.0, squares = 0.0, count = 0.0;
  for (size_t i = 0; i < t->dwells; i++) {
    if (t->dwell[i].level != level || isnan(t->dwell[i].mean_g0)) continue;
    weight += t->dwell[i].length_s;
    sum += t->dwell[i].length_s * t->dwell[i].mean_g0;
    count++;
  }
  double mean = sum / weight;
  for (size_t i = 0; i < t->dwells; i++) {
    if (t->dwell[i].level != level || isnan(t->dwell[i].mean_g0)) continue;
    double part = t->dwell[i].length_s * (t->dwell[i].mean_g0 - mean) / weight;
    squares += part * part;
  }
  double of_noise = t->level[level].noise_g0 / sqrt(fmax(1.0, weight / t->sampling_s));
  *error = count > 1 ? fmax(sqrt(squares * count / (count - 1)), of_noise) : of_noise;
  *freedom = count > 1 ? count - 1 : 1e6;
  return mean;
}

/* Mean excess over the dead time: events and time at risk, so that censored
 * dwells count with what was seen of them. */
static double mean_excess(const mho_telegraph *t, int level, uint64_t *events)
{
  double time = 0.0;
  *events = 0;
  for (size_t i = 0; i < t->dwells; i++) {
    const mho_dwell *d = &t->dwell[i];
    if (d->level != level) continue;
    bool has_start = d->start_s > 0.0; /* the first one is seen from any age */
    time += fmax(0.0, d->length_s - (has_start ? t->dead_time_s : 0.0));
    *events += !d->censored;
  }
  return *events ? time / (double)*events : NAN;
}

/* E[t | t < tau] of an exponential. */
static double short_mean(double rate, double tau)
{
  double x = rate * tau;
  return x < 1e-6 ? 0.5 * tau : 1.0 / rate - tau / expm1(x);
}

/* Rates behind the visible mean dwells; false where there are none. */
static bool correct_rates(const double *excess, double tau, double *rate)
{
  rate[0] = 1.0 / excess[0];
  rate[1] = 1.0 / excess[1];
  for (int i = 0; i < 500; i++) {
    double before[2] = {rate[0], rate[1]};
    for (int j = 0; j < 2; j++) {
      double other = rate[1 - j], missed = expm1(other * tau); /* q/(1 - q) */
      double left = excess[j] - missed * short_mean(other, tau);
      if (!(left > 0.0)) return false;
      rate[j] = 0.5 * (rate[j] + (1.0 + missed) / left);
    }
    if (fabs(rate[0] - before[0]) < 1e-12 * rate[0] && fabs(rate[1] - before[1]) < 1e-12 * rate[1])
      return true;
  }
  return false;
}

static int compare(const void *a, const void *b)
{
  double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

/* Kolmogorov's distance of sorted values to the exponential of their mean. */
static double exponential_distance(double *value, size_t n)
{
  double mean = 0.0, distance = 0.0;
  qsort(value, n, sizeof *value, compare);
  for (size_t i = 0; i < n; i++) mean += value[i] / (double)n;
  for (size_t i = 0; i < n; i++) {
    double p = -expm1(-value[i] / mean);
    distance = fmax(distance, fmax(p - (double)i / (double)n, (double)(i + 1) / (double)n - p));
  }
  return distance;
}

/* The distribution of the distance with an estimated mean is drawn (H. W.
 * Lilliefors, J. Am. Stat. Assoc. 64, 387 (1969), did the same). */
static double test_exponential(const mho_telegraph *t, int level)
{
  static const uint64_t seed = 20190520; /* any: the p value is a Monte Carlo sum */
  double value[TEST_DWELLS];
  size_t n = 0, beyond = 0;
  mho_random random = mho_random_stream(seed, (uint64_t)level);
  for (size_t i = 0; i < t->dwells && n < TEST_DWELLS; i++) {
    if (t->dwell[i].level != level || t->dwell[i].censored) continue;
    /* A length is known to a sample: spread evenly over it. */
    double u = (double)(mho_random_bits(&random) >> 11) * 0x1p-53 - 0.5;
    value[n++] = fmax(0.0, t->dwell[i].length_s - t->dead_time_s + u * t->sampling_s);
  }
  if (n < TEST_AT_LEAST) return NAN;
  double seen = exponential_distance(value, n);
  for (int draw = 0; draw < TEST_DRAWS; draw++) {
    for (size_t i = 0; i < n; i++)
      value[i] = -log(((double)(mho_random_bits(&random) >> 11) + 0.5) * 0x1p-53);
    beyond += exponential_distance(value, n) >= seen;
  }
  return (double)beyond / TEST_DRAWS;
}

static void summarise_dwells(mho_telegraph *t)
{
  double excess[MHO_LEVEL_LIMIT], rate[2] = {0, 0};
  for (int k = 0; k < t->levels; k++) excess[k] = mean_excess(t, k, &t->level[k].dwells);
  t->corrected = t->levels == 2 && excess[0] > 0.0 && excess[1] > 0.0 &&
                 correct_rates(excess, t->dead_time_s, rate);
  for (int k = 0; k < t->levels; k++) {
    mho_level *level = &t->level[k];
    double n = (double)level->dwells;
    level->seen_dwell_s = excess[k] + t->dead_time_s;
    level->dwell_s = t->corrected ? 1.0 / rate[k] : excess[k];
    level->dwell_low_s = level->dwell_high_s = NAN;
    level->exponential_p = test_exponential(t, k);
    if (level->dwells == 0) continue;
    /* 2 n mean / true mean has the chi-squared distribution. */
    level->dwell_low_s = level->dwell_s * 2.0 * n / gsl_cdf_chisq_Pinv(0.975, 2.0 * n);
    level->dwell_high_s = level->dwell_s * 2.0 * n / gsl_cdf_chisq_Pinv(0.025, 2.0 * n);
  }
}

mho_status mho_dwells_summarise(mho_telegraph *t)
{
  double error[MHO_LEVEL_LIMIT], freedom[MHO_LEVEL_LIMIT], total = 0.0;
  for (int k = 0; k < t->levels; k++) {
    mho_level *level = &t->level[k];
    for (size_t i = 0; i < t->dwells; i++)
      if (t->dwell[i].level == k) level->occupancy += t->dwell[i].length_s;
    total += level->occupancy;
    level->conductance_g0 = level_mean(t, k, &error[k], &freedom[k]);
    double reach = gsl_cdf_tdist_Pinv(0.975, freedom[k]) * error[k];
    level->low = level->conductance_g0 - reach;
    level->high = level->conductance_g0 + reach;
    if (!isfinite(level->conductance_g0)) return MHO_ERR_NOT_FINITE;
  }
  for (int k = 0; k < t->levels; k++) t->level[k].occupancy /= total;
  for (int k = 0; k + 1 < t->levels; k++) {
    double height = t->level[k + 1].conductance_g0 - t->level[k].conductance_g0;
    double reach = gsl_cdf_tdist_Pinv(0.975, fmin(freedom[k], freedom[k + 1])) *
                   hypot(error[k], error[k + 1]);
    t->step[k] = (mho_level_step){height, height - reach, height + reach};
  }
  summarise_dwells(t);
  return MHO_OK;
}
