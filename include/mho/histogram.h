/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Histograms of measured traces, in one pass over the files.
 *
 * Counts are kept per unit of whole traces, so that intervals can be drawn
 * from whole traces (points of one trace are correlated).  A unit is one
 * trace until there are MHO_UNIT_LIMIT of them; then neighbours are merged,
 * again and again: memory stays bounded, and the units stay whole traces.
 *
 * Displacement zero is the last crossing of `crossing_g0` downwards, where
 * the straight line in log10 G between the two points meets it (in G where
 * the lower point is not positive).  `snap_back_nm`, by which the electrodes
 * spring apart on rupture, is added to positive displacements.
 *
 * A trace is rejected as tunnelling-only by two rules:
 *   no-contact: it never crosses `crossing_g0` downwards;
 *   no-plateau: behind the crossing there is no window of `window_decades`,
 *     between `guard_decades` above the floor and the crossing, in which it
 *     spends `plateau_nm` or more.
 * Without a distance nothing can be rejected.  `all` holds every trace,
 * `accepted` those that were not rejected.
 */
#ifndef MHOLECULE_HISTOGRAM_H
#define MHOLECULE_HISTOGRAM_H

#include <mho/traces.h>

enum { MHO_UNIT_LIMIT = 2048 };

typedef struct {
  double low_log10_g0, high_log10_g0; /* -7 to 1 */
  int bins_per_decade;                /* 100, at most 1000 */
  double linear_high_g0;              /* 1.5; the linear histogram starts at 0 */
  int linear_bins;                    /* 1500 */
  double map_low_nm, map_high_nm;     /* -0.5 to 2.5 */
  int map_bins;                       /* 300 */
  int map_bins_per_decade;            /* 20 */
  double crossing_g0;                 /* 0.5 */
  double snap_back_nm;                /* 0; about 0.5 for gold is common practice */
  double window_decades;              /* 0.5 */
  double guard_decades;               /* 0.3 */
  double plateau_nm;                  /* 0.15 */
  bool plateaus;                      /* find the plateaus of every trace */
  double plateau_slope;               /* 3 decades/nm, the steepest plateau */
  double step_decades;                /* 0.2, the smallest step between two */
  bool clusters;                      /* keep a sample of single traces */
  uint64_t seed;                      /* of that sample */
} mho_histogram_options;

/* Logarithmic counts, in all and by unit of whole traces. */
typedef struct {
  double low_log10_g0;
  int bins_per_decade, bins;
  double floor_log10_g0; /* -INFINITY without a floor */
  uint64_t traces;
  uint64_t *count;       /* [bins] */
  uint64_t censored;     /* below the floor, zero or negative */
  uint64_t below, above; /* outside of the bins, not censored */
  size_t units;
  uint64_t traces_per_unit;
  uint32_t *unit_traces; /* [units] */
  uint32_t *unit_count;  /* [units * bins] */
} mho_trace_counts;

typedef struct {
  uint64_t trace;
  double length_nm, log10_g0, slope_decades_per_nm;
  double step_decades; /* down to the next plateau of the trace; NaN: last */
} mho_plateau;

enum { MHO_PLATEAU_LIMIT = 1000000, MHO_PLATEAU_LENGTH_BINS = 200 };

typedef struct {
  mho_histogram_options options;
  mho_trace_report report;
  double *edge_g0; /* [bins + 1] of the logarithmic bins */
  mho_trace_counts all, accepted; /* the same arrays where none is rejected */
  uint64_t *linear;                     /* [linear_bins], accepted */
  uint64_t linear_below, linear_above;  /* above: from linear_high_g0 on */
  bool has_distance;
  uint64_t aligned, no_contact, no_plateau, too_long; /* traces */
  int map_g_bins;
  uint64_t *map; /* [map_bins * map_g_bins], accepted; distance is the row */
  /* Sums over accepted traces of counts in bins of a tenth of a decade. */
  int coarse_bins;
  double *coarse_sum, *coarse_product; /* [n], [n * n] */
  size_t plateaus;
  uint64_t plateaus_dropped; /* beyond MHO_PLATEAU_LIMIT, still in lengths */
  mho_plateau *plateau;
  uint64_t plateau_lengths[MHO_PLATEAU_LENGTH_BINS]; /* of 0.02 nm */
  size_t samples;                                    /* single traces */
  uint64_t *sample_trace; /* [samples] their numbers */
  uint32_t *sample_count; /* [samples * bins] */
} mho_histogram;

MHO_BEGIN_DECLARATIONS

MHO_API void mho_histogram_options_init(mho_histogram_options *options);

/* Reads the files into a new histogram.  Errors: those of the reader, and
 * MHO_ERR_RANGE for an option. */
MHO_API MHO_MUST_USE mho_status mho_histogram_read(
    const char *const *paths, size_t count, const mho_trace_options *traces,
    const mho_histogram_options *options, mho_histogram **histogram,
    mho_error *error);
MHO_API void mho_histogram_free(mho_histogram *histogram);

/* Centre of a bin, and counts normalised per trace and decade (per trace and
 * G0 for the linear bins); 0 without traces. */
MHO_API double mho_histogram_log10_g0(const mho_histogram *histogram, int bin);
MHO_API double mho_histogram_density(const mho_trace_counts *counts, int bin);
MHO_API double mho_histogram_linear_g0(const mho_histogram *histogram, int bin);
MHO_API double mho_histogram_linear_density(const mho_histogram *histogram,
                                            int bin);

/* Correlation over traces between the counts in bins of a tenth of a decade:
 * correlation[n * n] with n = coarse_bins, first bin at low_log10_g0; 0 where
 * a bin is empty.  Negative: features that exclude each other. */
MHO_API void mho_histogram_correlation(const mho_histogram *histogram,
                                       double *correlation);

/* Bins doubles at once, for callers with their own data: count[bins] += 1,
 * *below and *above what lies outside.  NaN is skipped.
 * Errors: MHO_ERR_RANGE, MHO_ERR_MEMORY. */
MHO_API MHO_MUST_USE mho_status mho_histogram_bin(
    const double *g0, size_t n, double low_log10_g0, double high_log10_g0,
    int bins_per_decade, uint64_t *count, uint64_t *below, uint64_t *above,
    mho_error *error);

MHO_END_DECLARATIONS

#endif
