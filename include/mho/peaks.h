/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Peaks of measured conductances, with intervals that can be trusted.
 *
 * Points of one trace are correlated: the number of peaks is chosen by
 * cross-validation over whole traces, and intervals come from a bootstrap
 * over whole traces (B. Efron, Ann. Stat. 7, 1 (1979); percentiles).  The
 * same seed gives the same result at any number of threads.
 */
#ifndef MHOLECULE_PEAKS_H
#define MHOLECULE_PEAKS_H

#include <mho/histogram.h>

enum { MHO_PEAK_LIMIT = 5, MHO_COMB_LIMIT = 6, MHO_CLUSTER_LIMIT = 5 };

/* --- Peaks of the logarithmic histogram ------------------------------- */

typedef struct {
  double low_log10_g0, high_log10_g0; /* the window; NaN: from the floor (or
                                         the first 1 % of points; better give
                                         a floor) to -0.45 */
  int most;                           /* peaks looked for, 4 */
  int resamples;                      /* of the bootstrap, 400 */
  double prominence;                  /* 0.1: over its higher flank */
  double significance;                /* 0.025 */
  uint64_t seed;
} mho_peak_options;

/* A peak of the `log` histogram: centre of a Gaussian in log10 G. */
typedef struct {
  double log10_g0, low, high;     /* 95 % interval */
  double width_decades;           /* standard deviation */
  double weight;                  /* share of the points of the window */
  double prominence;              /* height over the higher flank, relative */
  double p_value;                 /* share of resamples without this maximum */
  double drift_decades, drift_p;  /* second half minus first half */
  uint64_t traces_to_halve;       /* more traces that halve the interval, as
                                     1/sqrt(traces): three times those there */
} mho_peak;

typedef struct {
  int count;
  mho_peak peak[MHO_PEAK_LIMIT];
  int components;       /* Gaussians fitted, also those that are no peak */
  double gain[MHO_PEAK_LIMIT + 1], gain_error[MHO_PEAK_LIMIT + 1];
                        /* cross-validated log likelihood a unit that
                           component k brought, and its standard error */
  uint64_t traces;
  double low_log10_g0, high_log10_g0; /* window */
  int bins;             /* of the fit */
  double *fit;          /* [bins] fitted density per trace and decade */
  double *background;   /* [bins] its plateau alone */
  double *observed;     /* [bins] */
} mho_peaks;

MHO_BEGIN_DECLARATIONS

MHO_API void mho_peak_options_init(mho_peak_options *options);

/* A mixture of Gaussians, each with the tail that its traces leave on their way
 * down, and a plateau with soft edges and a tilt (the tunnelling background)
 * is fitted by maximum likelihood; a component is a
 * peak if the fitted density has a local maximum there, in all but
 * `significance` of the resamples, that stands `prominence` over its higher
 * flank and is narrower than a decade at half height.  No peak: count = 0,
 * MHO_OK.  Clear with mho_peaks_clear.
 * Errors: MHO_ERR_RANGE (window), MHO_ERR_MEMORY. */
MHO_API MHO_MUST_USE mho_status mho_peaks_find(const mho_trace_counts *counts,
                                               const mho_peak_options *options,
                                               mho_peaks *peaks,
                                               mho_error *error);
MHO_API void mho_peaks_clear(mho_peaks *peaks);

/* --- Comb: whole multiples of one conductance -------------------------- */

typedef struct {
  double low_g0, high_g0; /* where G1 may be */
  int most;               /* multiples looked for, 4 */
  int resamples;          /* 400 */
  uint64_t seed;
} mho_comb_options;

typedef struct {
  int multiple;
  double conductance_g0, low, high; /* its own centre, free of the comb */
  double share;                     /* points over those of the first */
  double p_value;                   /* share of resamples without it */
  bool supported;                   /* significant, and n G1 in its interval */
} mho_comb_tooth;

/* Of the `linear` histogram. */
typedef struct {
  bool found;                /* G1 has a significant peak; else all is 0 */
  double g1_g0, low, high;   /* from the comb, 95 % */
  int count;
  mho_comb_tooth tooth[MHO_COMB_LIMIT]; /* those asked for in the window */
  double comb_gain, comb_gain_error;    /* cross-validated log likelihood a
                 unit of the comb over peaks that are free of each other */
  bool is_comb; /* two multiples at least are supported, and free peaks are
                   not better by more than two errors */
} mho_comb;

MHO_API void mho_comb_options_init(mho_comb_options *options);

/* The density in G is Gaussians at n G1, of widths s n^q (q = 1/2 where the
 * molecules scatter independently), on an exponential background; the counts are those of the logarithmic bins,
 * as bins of unequal width in G. */
MHO_API MHO_MUST_USE mho_status mho_comb_find(const mho_trace_counts *counts,
                                              const mho_comb_options *options,
                                              mho_comb *comb, mho_error *error);

/* --- Clusters of traces by shape --------------------------------------- */

typedef struct {
  uint64_t traces;
  double share;
  double log10_g0;        /* highest point of its smoothed histogram */
  double low, high;       /* 95 %, bootstrap over its traces */
} mho_cluster;

typedef struct {
  int count;
  mho_cluster cluster[MHO_CLUSTER_LIMIT];
  double silhouette;      /* of the chosen number; 0 for one cluster */
  double stability;       /* mean adjusted Rand index of half samples */
  int *member;            /* [samples] of the histogram */
} mho_clusters;

/* k-means on square roots of the counts in bins of 0.2 decades, each trace
 * normalised (Hellinger distance), of the sampled traces (options.clusters of
 * the histogram); k by silhouette (P. J. Rousseeuw, J. Comput. Appl. Math.
 * 20, 53 (1987)), one cluster where that or the stability is below 0.25/0.6.
 * Errors: MHO_ERR_RANGE (no sample), MHO_ERR_MEMORY. */
MHO_API MHO_MUST_USE mho_status mho_clusters_find(const mho_histogram *histogram,
                                                  double low_log10_g0,
                                                  double high_log10_g0,
                                                  uint64_t seed,
                                                  mho_clusters *clusters,
                                                  mho_error *error);
MHO_API void mho_clusters_clear(mho_clusters *clusters);

MHO_END_DECLARATIONS

#endif
