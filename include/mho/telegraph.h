/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Conductance against time: a junction that switches between levels, and the
 * noise of one that stays.
 *
 * Idealisation by a hidden Markov model with Gaussian emissions: Baum and
 * Welch's estimates and Viterbi's path (L. R. Rabiner, Proc. IEEE 77, 257
 * (1989)).  Dwells shorter than the resolution of the instrument are not
 * seen; the resolution is imposed on the path and the rates are corrected for
 * what it hides.
 */
#ifndef MHOLECULE_TELEGRAPH_H
#define MHOLECULE_TELEGRAPH_H

#include <mho/traces.h>

enum { MHO_LEVEL_LIMIT = 3, MHO_TELEGRAPH_POINT_LIMIT = 1 << 26 };

typedef struct {
  int most_levels;     /* 3 */
  int levels;          /* a fixed number of levels, or 0: tested */
  double bandwidth_hz; /* of the instrument (-3 dB); 0: the sampling only */
  double dead_time_s;  /* 0: 0.179/bandwidth, at least one sample */
  bool drift;          /* take off a straight drift of all levels; true */
} mho_telegraph_options;

/* One stay on one level. */
typedef struct {
  uint64_t trace;
  int level;
  double start_s, length_s;
  double mean_g0;
  bool censored; /* the trace starts or ends in it */
} mho_dwell;

/* Levels ascend in conductance. */
typedef struct {
  double conductance_g0, low, high; /* 95 %, from the means of the dwells */
  double noise_g0;                  /* standard deviation of a point */
  double dwell_s, dwell_low_s, dwell_high_s; /* mean of the exponential, after
                                       correction; NaN without a whole dwell */
  double seen_dwell_s;              /* before correction */
  double occupancy;                 /* share of the time */
  uint64_t dwells;                  /* whole ones */
  double exponential_p;             /* that whole dwells are exponential;
                                       NaN for fewer than 8 */
} mho_level;

/* Between neighbouring levels: the conductance of one molecule, as is common
 * practice to read it. */
typedef struct {
  double height_g0, low, high; /* 95 % */
} mho_level_step;

typedef struct {
  int levels;
  mho_level level[MHO_LEVEL_LIMIT];
  mho_level_step step[MHO_LEVEL_LIMIT - 1];
  double gain[MHO_LEVEL_LIMIT + 1], gain_error[MHO_LEVEL_LIMIT + 1];
                 /* log likelihood a block of unseen points that level k
                    brought, and its standard error; k from 2 */
  double sampling_s, dead_time_s;
  bool corrected;           /* for the dead time: of two levels */
  double drift_g0_per_s;    /* taken off */
  uint64_t points, missing; /* missing: not finite, bridged */
  mho_trace_report report;
  size_t dwells;
  mho_dwell *dwell; /* [dwells], in time */
} mho_telegraph;

typedef struct {
  double low_hz, high_hz; /* band of the noise: 100 to 1000 */
  int resamples;          /* 400 */
  uint64_t seed;
} mho_flicker_options;

typedef struct {
  size_t junctions; /* traces that were long and dense enough */
  uint64_t unusable;
  double exponent, low, high; /* of noise power against G; 95 % */
  double *conductance_g0, *noise_g0_squared; /* [junctions] */
  mho_trace_report report;
} mho_flicker;

MHO_BEGIN_DECLARATIONS

MHO_API void mho_telegraph_options_init(mho_telegraph_options *options);

/* Reads the files (a time column or sampling_hz is needed) and idealises
 * them, all traces with one model.  A signal of one level: levels = 1, no
 * step.  Clear with mho_telegraph_clear.
 * Errors: those of the reader; MHO_ERR_RANGE (no time, too few points);
 * MHO_ERR_LIMIT above MHO_TELEGRAPH_POINT_LIMIT points. */
MHO_API MHO_MUST_USE mho_status mho_telegraph_read(
    const char *const *paths, size_t count, const mho_trace_options *traces,
    const mho_telegraph_options *options, mho_telegraph *telegraph,
    mho_error *error);

/* The same for a signal in memory, one trace. */
MHO_API MHO_MUST_USE mho_status mho_telegraph_idealise(
    const double *g0, size_t n, double sampling_s,
    const mho_telegraph_options *options, mho_telegraph *telegraph,
    mho_error *error);
MHO_API void mho_telegraph_clear(mho_telegraph *telegraph);

/* One-sided power spectrum at f of a two-level signal of step height
 * `step` with mean dwells tau1, tau2 (S. Machlup, J. Appl. Phys. 25, 341
 * (1954)); in step^2/Hz. */
MHO_API double mho_telegraph_spectrum(double step, double tau1_s, double tau2_s,
                                      double frequency_hz);

MHO_API void mho_flicker_options_init(mho_flicker_options *options);

/* Flicker noise of junctions that are held, one a trace: power of the noise
 * in the band grows as G^exponent; about 1 is read as through-bond, about 2
 * as through-space (O. Adak et al., Nano Lett. 15, 4143 (2015); from memory).
 * The exponent is NaN for fewer than ten junctions.
 * Errors: those of the reader, MHO_ERR_RANGE. */
MHO_API MHO_MUST_USE mho_status mho_flicker_read(
    const char *const *paths, size_t count, const mho_trace_options *traces,
    const mho_flicker_options *options, mho_flicker *flicker, mho_error *error);
MHO_API void mho_flicker_clear(mho_flicker *flicker);

MHO_END_DECLARATIONS

#endif
