/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Whole multiples of one conductance.
 *
 * density(G) = sum_n A_n N(G; c_n, s1 n^q) + B exp(-G/b) + C, with c_n =
 * n G1 for the comb and c_n free for unrelated peaks.  Both are fitted to the
 * same counts and compared on traces that neither has seen.
 */
#include <mho/peaks.h>

#include "measure/fit.h"
#include "measure/sample.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { P = MHO_FIT_PARAMETERS };

#define SQRT1_2 0.70710678118654752440
#define SQRT_1_2PI 0.39894228040143267794
#define RATE_FLOOR 1e-6

/* Parameters: ln s1, q, ln B, ln b, ln C, then ln A_n for each tooth, then ln G1
 * or, where the centres are free, ln c_n for each. */
typedef struct {
  int bins, teeth;
  bool is_free;
  const double *edge; /* [bins + 1] in G0 */
  double unit_g0;     /* G1 where the search starts: sets the scale */
} comb_model;

enum { LN_WIDTH, GROWTH, LN_B, LN_DECAY, LN_C, LN_A };

static int parameters_of(const comb_model *m)
{
  return LN_A + m->teeth + (m->is_free ? m->teeth : 1);
}

static int centre_of(const comb_model *m, int tooth)
{
  return LN_A + m->teeth + (m->is_free ? tooth : 0);
}

static double width_of(const double *p, int tooth)
{
  return exp(p[LN_WIDTH]) * pow(tooth + 1.0, p[GROWTH]);
}

static void add_tooth(const comb_model *m, const double *p, int tooth, double *rate,
                      double *jacobian)
{
  int n = parameters_of(m), where = centre_of(m, tooth);
  double centre = exp(p[where]) * (m->is_free ? 1.0 : tooth + 1);
  double sigma = width_of(p, tooth), amplitude = exp(p[LN_A + tooth]);
  double z = (m->edge[0] - centre) / sigma, cdf = 0.5 * erf(z * SQRT1_2);
  double pdf = SQRT_1_2PI * exp(-0.5 * z * z);
  for (int i = 0; i < m->bins; i++) {
    double z1 = (m->edge[i + 1] - centre) / sigma, cdf1 = 0.5 * erf(z1 * SQRT1_2);
    double pdf1 = jacobian ? SQRT_1_2PI * exp(-0.5 * z1 * z1) : 0.0;
    double part = amplitude * (cdf1 - cdf);
    rate[i] += part;
    if (jacobian) {
      double *row = jacobian + i * n;
      row[LN_A + tooth] = part;
      row[LN_WIDTH] += -amplitude * (z1 * pdf1 - z * pdf);
      row[GROWTH] += -amplitude * (z1 * pdf1 - z * pdf) * log(tooth + 1.0);
      row[where] += -amplitude * (pdf1 - pdf) * centre / sigma;
    }
    z = z1, cdf = cdf1, pdf = pdf1;
  }
}

static void add_background(const comb_model *m, const double *p, double *rate, double *jacobian)
{
  int n = parameters_of(m);
  double decay = exp(p[LN_DECAY]), b = exp(p[LN_B]), c = exp(p[LN_C]);
  for (int i = 0; i < m->bins; i++) {
    double width = m->edge[i + 1] - m->edge[i], x = 0.5 * (m->edge[i + 1] + m->edge[i]);
    double falling = b * exp(-x / decay) * width, constant = c * width;
    rate[i] += falling + constant;
    if (!jacobian) continue;
    jacobian[i * n + LN_B] = falling;
    jacobian[i * n + LN_DECAY] = falling * x / decay;
    jacobian[i * n + LN_C] = constant;
  }
}

static void comb_rate(const void *context, const double *parameter, double *rate,
                      double *jacobian)
{
  const comb_model *m = context;
  for (int i = 0; i < m->bins; i++) rate[i] = RATE_FLOOR;
  if (jacobian)
    memset(jacobian, 0, (size_t)m->bins * (size_t)parameters_of(m) * sizeof *jacobian);
  for (int tooth = 0; tooth < m->teeth; tooth++)
    add_tooth(m, parameter, tooth, rate, jacobian);
  add_background(m, parameter, rate, jacobian);
}

static mho_fit_problem comb_problem(const comb_model *m)
{
  mho_fit_problem problem = {comb_rate, m, m->bins, parameters_of(m), {0}, {0}};
  double ln_unit = log(m->unit_g0);
  for (int i = 0; i < problem.parameters; i++) {
    problem.lower[i] = -30.0;
    problem.upper[i] = 60.0;
  }
  problem.lower[LN_WIDTH] = ln_unit - 4.0; /* 0.02 to 0.5 of G1 */
  problem.upper[LN_WIDTH] = ln_unit - 0.7;
  problem.lower[GROWTH] = 0.3;
  problem.upper[GROWTH] = 1.2;
  problem.lower[LN_DECAY] = ln_unit - 2.0;
  problem.upper[LN_DECAY] = ln_unit + 5.0;
  for (int i = LN_A + m->teeth; i < problem.parameters; i++) {
    double multiple = m->is_free ? log(i - LN_A - m->teeth + 1.0) : 0.0;
    double reach = m->is_free && i > LN_A + m->teeth ? 0.4 / (i - LN_A - m->teeth + 1) + 0.1 : 0.3;
    problem.lower[i] = ln_unit + multiple - reach;
    problem.upper[i] = ln_unit + multiple + reach;
  }
  return problem;
}

typedef struct {
  const mho_comb_options *options;
  mho_sample sample;
  double *edge_g0;
  comb_model comb, unrelated;
  double parameter[2][P]; /* of the comb and of free peaks */
  double *work, *likelihood;
} search;

void mho_comb_options_init(mho_comb_options *options)
{
  *options = (mho_comb_options){.low_g0 = 1e-5, .high_g0 = 0.1, .most = 4, .resamples = 400};
}

static void start_parameters(const comb_model *m, const double *count, double *parameter)
{
  double total = 0.0;
  for (int i = 0; i < m->bins; i++) total += count[i];
  double span = m->edge[m->bins] - m->edge[0];
  parameter[LN_WIDTH] = log(0.2 * m->unit_g0);
  parameter[GROWTH] = 0.5;
  parameter[LN_B] = log(0.3 * total / m->unit_g0 + 1e-9);
  parameter[LN_DECAY] = log(m->unit_g0);
  parameter[LN_C] = log(0.1 * total / span + 1e-9);
  for (int i = 0; i < m->teeth; i++) parameter[LN_A + i] = log(0.3 * total / (i + 1) + 1e-9);
  for (int i = 0; i < m->teeth; i++)
    parameter[centre_of(m, i)] = log(m->unit_g0 * (m->is_free ? i + 1 : 1));
}

static double fit(const comb_model *m, const double *count, double *parameter, double *work)
{
  mho_fit_problem problem = comb_problem(m);
  return mho_fit_counts(&problem, count, parameter, work);
}

/* Bins around the teeth of a comb that starts at unit_g0. */
static mho_status set_window(search *s, const mho_trace_counts *counts, double unit_g0,
                             mho_error *error)
{
  mho_sample_clear(&s->sample);
  int teeth = s->options->most;
  double low = log10(0.4 * unit_g0), high = log10((teeth + 0.6) * unit_g0);
  if (low < counts->floor_log10_g0) low = counts->floor_log10_g0;
  mho_status status = mho_sample_init(&s->sample, counts, low, high, 1, 8, error);
  if (status != MHO_OK) return status;
  for (int i = 0; i <= s->sample.bins; i++) s->edge_g0[i] = pow(10.0, s->sample.edge[i]);
  s->comb = (comb_model){s->sample.bins, teeth, false, s->edge_g0, unit_g0};
  s->unrelated = s->comb;
  s->unrelated.is_free = true;
  return MHO_OK;
}

/* Counts per G0, smoothed over seven bins, at bin i of the whole histogram. */
static double smooth_density(const mho_trace_counts *counts, int i, double power)
{
  double sum = 0.0, width = 0.0;
  for (int j = i - 3; j <= i + 3; j++) {
    if (j < 0 || j >= counts->bins) continue;
    double edge = counts->low_log10_g0 + (double)j / counts->bins_per_decade;
    double next = counts->low_log10_g0 + (double)(j + 1) / counts->bins_per_decade;
    sum += (double)counts->count[j];
    width += pow(10.0, next) - pow(10.0, edge);
  }
  double x = pow(10.0, counts->low_log10_g0 + (i + 0.5) / counts->bins_per_decade);
  return width > 0.0 ? sum / width * pow(x, power) : 0.0;
}

/* The highest point of the density in log G within the window starts G1. */
static double first_guess(const search *s, const mho_trace_counts *counts)
{
  double best = 0.0, guess = 0.0;
  for (int i = 0; i < counts->bins; i++) {
    double x = counts->low_log10_g0 + (i + 0.5) / counts->bins_per_decade;
    if (x < log10(s->options->low_g0) || x > log10(s->options->high_g0)) continue;
    if (x < counts->floor_log10_g0) continue;
    double density = smooth_density(counts, i, 1.0);
    if (density > best) best = density, guess = pow(10.0, x);
  }
  return guess;
}

/* True where the density of free peaks has a maximum at its tooth. */
static bool stands_out(const comb_model *m, const double *p, int tooth)
{
  double centre = exp(p[centre_of(m, tooth)]), sigma = width_of(p, tooth);
  double density[3];
  for (int side = -1; side <= 1; side++) {
    double x = centre + side * sigma;
    density[side + 1] = exp(p[LN_B] - x / exp(p[LN_DECAY])) + exp(p[LN_C]);
    for (int k = 0; k < m->teeth; k++) {
      double s = width_of(p, k), z = (x - exp(p[centre_of(m, k)])) / s;
      density[side + 1] += exp(p[LN_A + k]) * SQRT_1_2PI / s * exp(-0.5 * z * z);
    }
  }
  return density[1] > density[0] && density[1] > density[2];
}

/* The highest point may be a multiple: of its whole fractions the smallest
 * at which the density has a maximum is where the search starts. */
static mho_status find_start(search *s, const mho_trace_counts *counts, double *unit_g0,
                             mho_error *error)
{
  double guess = first_guess(s, counts);
  *unit_g0 = 0.0;
  for (int part = 1; part <= 3 && guess / part >= s->options->low_g0; part++) {
    mho_status status = set_window(s, counts, guess / part, error);
    if (status != MHO_OK) return status;
    double parameter[P];
    start_parameters(&s->unrelated, s->sample.total, parameter);
    fit(&s->unrelated, s->sample.total, parameter, s->work);
    if (part == 1 || stands_out(&s->unrelated, parameter, 0))
      *unit_g0 = exp(parameter[centre_of(&s->unrelated, 0)]);
  }
  return *unit_g0 > 0.0 ? set_window(s, counts, *unit_g0, error) : MHO_OK;
}

static void cross_validate(search *s, const comb_model *m, const double *start,
                           double *likelihood)
{
  double *count = s->work + MHO_FIT_WORK(s->sample.bins, P);
  for (size_t fold = 0; fold < MHO_FOLDS; fold++) {
    double parameter[P];
    memcpy(parameter, start, sizeof parameter);
    mho_sample_without_fold(&s->sample, fold, count);
    fit(m, count, parameter, s->work);
    comb_rate(m, parameter, s->work, NULL);
    mho_sample_score(&s->sample, fold, s->work, likelihood);
  }
}

/* Comb and free peaks, parameter[2 * P]. */
static void refit_both(const void *context, const double *count, double *parameter, double *work)
{
  const search *s = context;
  fit(&s->comb, count, parameter, work);
  fit(&s->unrelated, count, parameter + P, work);
}

static void judge_tooth(const search *s, int tooth, const double *resampled, double *value,
                        const mho_comb *comb, mho_comb_tooth *result)
{
  const double *p = s->parameter[1];
  size_t resamples = (size_t)s->options->resamples, without = 0;
  int where = centre_of(&s->unrelated, tooth);
  for (size_t b = 0; b < resamples; b++) {
    const double *q = resampled + (2 * b + 1) * P;
    value[b] = exp(q[where]);
    without += !stands_out(&s->unrelated, q, tooth);
  }
  *result = (mho_comb_tooth){.multiple = tooth + 1, .conductance_g0 = exp(p[where]),
                             .share = exp(p[LN_A + tooth] - p[LN_A])};
  result->p_value = (double)without / (double)resamples;
  result->low = mho_quantile(value, resamples, 0.025);
  result->high = mho_quantile(value, resamples, 0.975);
  double expected = (tooth + 1) * comb->g1_g0;
  result->supported = result->p_value <= 0.025 && stands_out(&s->unrelated, p, tooth) &&
                      result->low <= expected && expected <= result->high;
}

static mho_status judge(search *s, mho_comb *comb)
{
  size_t resamples = (size_t)s->options->resamples, units = s->sample.units;
  double *resampled = malloc(resamples * 2 * P * sizeof *resampled);
  double *value = malloc(resamples * sizeof *value);
  mho_status status = MHO_ERR_MEMORY;
  if (resampled && value)
    status = mho_sample_bootstrap(&s->sample, s->options->seed, s->options->resamples, refit_both,
                                  s, MHO_FIT_WORK(s->sample.bins, P), s->parameter[0], 2 * P,
                                  resampled);
  if (status == MHO_OK) {
    int where = centre_of(&s->comb, 0), supported = 0;
    comb->g1_g0 = exp(s->parameter[0][where]);
    for (size_t b = 0; b < resamples; b++) value[b] = exp(resampled[2 * b * P + (size_t)where]);
    comb->low = mho_quantile(value, resamples, 0.025);
    comb->high = mho_quantile(value, resamples, 0.975);
    comb->count = s->options->most;
    for (int tooth = 0; tooth < comb->count; tooth++) {
      judge_tooth(s, tooth, resampled, value, comb, &comb->tooth[tooth]);
      supported += comb->tooth[tooth].supported;
    }
    comb->found = comb->tooth[0].p_value <= 0.025;
    cross_validate(s, &s->comb, s->parameter[0], s->likelihood);
    cross_validate(s, &s->unrelated, s->parameter[1], s->likelihood + units);
    mho_paired_gain(s->likelihood, s->likelihood + units, units, &comb->comb_gain,
                    &comb->comb_gain_error);
    comb->is_comb = comb->tooth[0].supported && supported >= 2 &&
                    comb->comb_gain > -2.0 * comb->comb_gain_error;
    if (!comb->found) *comb = (mho_comb){0};
  }
  free(resampled);
  free(value);
  return status;
}

mho_status mho_comb_find(const mho_trace_counts *counts, const mho_comb_options *options,
                         mho_comb *comb, mho_error *error)
{
  *comb = (mho_comb){0};
  if (options->most < 1 || options->most > MHO_COMB_LIMIT || options->resamples < 40 ||
      !(options->low_g0 > 0.0 && options->low_g0 < options->high_g0))
    return mho_fail(error, MHO_ERR_RANGE, "measure", "comb",
                    "1 to %d multiples, 40 resamples at least and a positive range "
                    "of conductances are allowed", MHO_COMB_LIMIT);
  if (counts->units < MHO_UNITS_AT_LEAST) return MHO_OK; /* nothing can be claimed */
  search s = {.options = options};
  size_t bins = (size_t)counts->bins;
  s.edge_g0 = malloc((bins + 1) * sizeof *s.edge_g0);
  s.work = malloc((MHO_FIT_WORK(bins, P) + bins) * sizeof *s.work);
  s.likelihood = malloc(2 * counts->units * sizeof *s.likelihood);
  mho_status status = MHO_OK;
  double unit_g0 = 0.0;
  if (!s.edge_g0 || !s.work || !s.likelihood)
    status = mho_fail(error, MHO_ERR_MEMORY, "measure", NULL, "out of memory");
  if (status == MHO_OK) status = find_start(&s, counts, &unit_g0, error);
  if (status == MHO_OK && unit_g0 > 0.0) {
    start_parameters(&s.comb, s.sample.total, s.parameter[0]);
    fit(&s.comb, s.sample.total, s.parameter[0], s.work);
    start_parameters(&s.unrelated, s.sample.total, s.parameter[1]);
    fit(&s.unrelated, s.sample.total, s.parameter[1], s.work);
    status = judge(&s, comb);
    if (status != MHO_OK) mho_fail(error, status, "measure", NULL, "out of memory");
  }
  free(s.edge_g0);
  free(s.work);
  free(s.likelihood);
  mho_sample_clear(&s.sample);
  return status;
}
