/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Counts in a window, by unit of whole traces, and resamples of them.
 */
#ifndef MHOLECULE_MEASURE_SAMPLE_H
#define MHOLECULE_MEASURE_SAMPLE_H

#include <mho/histogram.h>

enum { MHO_FOLDS = 5, MHO_UNITS_AT_LEAST = 10 };

typedef struct {
  int bins;
  size_t units;
  double *edge;  /* [bins + 1] in log10 G */
  double *count; /* [units * bins] */
  double *total; /* [bins] */
} mho_sample;

/* Takes the bins from log10 G low to high (rounded inwards), `group` of them
 * as one.  Errors: MHO_ERR_RANGE (fewer than `least` bins), MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_sample_init(mho_sample *sample, const mho_trace_counts *counts,
                                        double low, double high, int group, int least,
                                        mho_error *error);
void mho_sample_clear(mho_sample *sample);

/* Fits to count[bins] from parameter[] on; work is for one fit. */
typedef void mho_sample_fit(const void *context, const double *count, double *parameter,
                            double *work);

/* Bootstrap over whole traces: fits to sums of as many units as there are,
 * drawn with replacement, from parameter[n] on, into resampled[resamples * n].
 * `work` doubles are given to a fit.  The same at any number of threads.
 * Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_sample_bootstrap(const mho_sample *sample, uint64_t seed,
                                             int resamples, mho_sample_fit *fit,
                                             const void *context, size_t work,
                                             const double *parameter, size_t n,
                                             double *resampled);

/* Sum of the units from first to before last. */
void mho_sample_sum(const mho_sample *sample, size_t first, size_t last, double *count);

/* Sum of the units that are not in a fold of the cross-validation: unit i is
 * in fold i mod MHO_FOLDS. */
void mho_sample_without_fold(const mho_sample *sample, size_t fold, double *count);

/* Log likelihood of every unit of a fold under the density of rate[bins],
 * into likelihood[units] at the units of that fold. */
void mho_sample_score(const mho_sample *sample, size_t fold, const double *rate,
                      double *likelihood);

/* Mean of a - b over units and its standard error. */
void mho_paired_gain(const double *a, const double *b, size_t n, double *mean, double *error);

/* Sorts values[n] and gives the quantile q, linear between order statistics. */
double mho_quantile(double *value, size_t n, double q);
double mho_deviation(const double *value, size_t n); /* standard deviation */

#endif
