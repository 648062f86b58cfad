/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Invented traces with known truth.
 *
 * A pull: contact near 1 G0, rupture at displacement 0, with probability
 * `yield` a molecular plateau whose conductance is log-normal from trace to
 * trace (D. Djukic and J. M. van Ruitenbeek, and others: the shape is common
 * practice), then a tunnelling current that decays exponentially from an
 * onset that scatters normally in log10 G, down to the noise of the
 * preamplifier.  Written as .npy or text.
 */
#ifndef MHOLECULE_TESTS_SYNTHETIC_H
#define MHOLECULE_TESTS_SYNTHETIC_H

#include <math.h>
#include <stdbool.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/random.h"

typedef struct {
  double log10_g0;      /* of the molecule */
  double spread;        /* trace to trace, decades */
  double noise;         /* point to point, decades */
  double yield;         /* share of traces with a molecule */
  double multiple[4];   /* shares of 1, 2, 3, 4 molecules in parallel; 0: one */
  double length_nm, length_spread_nm;
  double drift_decades; /* from the first trace to the last */
  double other_log10_g0, other_yield; /* a second plateau, never with the first */
  double floor_g0;
  double step_nm;
} synthetic_pull;

static inline double synthetic_uniform(mho_random *random)
{
  return ((double)(mho_random_bits(random) >> 11) + 0.5) * 0x1p-53;
}

/* Box and Muller, Ann. Math. Stat. 29, 610 (1958). */
static inline double synthetic_normal(mho_random *random)
{
  double u = synthetic_uniform(random), v = synthetic_uniform(random);
  return sqrt(-2.0 * log(u)) * cos(6.283185307179586 * v);
}

static inline synthetic_pull synthetic_pull_default(void)
{
  return (synthetic_pull){.log10_g0 = -3.0, .spread = 0.25, .noise = 0.08, .yield = 0.6,
                          .length_nm = 0.5, .length_spread_nm = 0.12,
                          .floor_g0 = 1e-6, .step_nm = 0.005};
}

enum { SYNTHETIC_POINTS = 1000 };

static inline double synthetic_molecules(mho_random *random, const synthetic_pull *s)
{
  double u = synthetic_uniform(random);
  for (int n = 0; n < 4; n++) {
    if (u < s->multiple[n]) return n + 1;
    u -= s->multiple[n];
  }
  return 1.0;
}

/* Trace number `index` of `traces`; returns its points. */
static inline size_t synthetic_trace(const synthetic_pull *s, uint64_t seed, size_t index,
                                     size_t traces, double *x, double *g)
{
  mho_random random = mho_random_stream(seed, index);
  double u = synthetic_uniform(&random), mu = NAN;
  if (u < s->yield) mu = s->log10_g0;
  else if (u < s->yield + s->other_yield) mu = s->other_log10_g0;
  if (traces > 1) mu += s->drift_decades * ((double)index / (double)(traces - 1) - 0.5);
  mu += log10(synthetic_molecules(&random, s)) + s->spread * synthetic_normal(&random);
  double length = 0.0, onset = -1.2 + 0.4 * synthetic_normal(&random);
  double decay = 6.0 + 0.5 * synthetic_normal(&random); /* decades/nm */
  if (!isnan(mu)) length = fmax(0.2, s->length_nm + s->length_spread_nm * synthetic_normal(&random));
  double start = -0.3 - 0.1 * synthetic_uniform(&random);
  size_t n = 0;
  for (double at = start; n < SYNTHETIC_POINTS && at < 1.8; at += s->step_nm) {
    double value;
    if (at < 0.0) value = at < -0.2 ? log10(2.0) : 0.0;
    else if (at < length) value = mu;
    else value = (length > 0.0 ? mu - 0.3 : onset) - decay * (at - length);
    double noise = at < 0.0 ? 0.02 : s->noise;
    x[n] = at;
    g[n] = pow(10.0, value + noise * synthetic_normal(&random)) +
           0.3 * s->floor_g0 * synthetic_normal(&random);
    n++;
  }
  return n;
}

static inline void synthetic_npy_header(FILE *file, size_t rows, int columns)
{
  char header[128];
  memset(header, ' ', sizeof header);
  memcpy(header, "\x93NUMPY\x01\x00\x76\x00", 10);
  int length = snprintf(header + 10, sizeof header - 10,
                        "{'descr': '<f8', 'fortran_order': False, 'shape': (%zu, %d), }", rows,
                        columns);
  header[10 + length] = ' ';
  header[127] = '\n';
  fwrite(header, 1, sizeof header, file);
}

/* Writes traces as one .npy of displacement and conductance. */
static inline bool synthetic_write_npy(const char *path, const synthetic_pull *s, uint64_t seed,
                                       size_t traces)
{
  static double x[SYNTHETIC_POINTS], g[SYNTHETIC_POINTS];
  size_t rows = 0;
  for (size_t i = 0; i < traces; i++) rows += synthetic_trace(s, seed, i, traces, x, g);
  FILE *file = fopen(path, "wb");
  if (!file) return false;
  synthetic_npy_header(file, rows, 2);
  for (size_t i = 0; i < traces; i++) {
    size_t n = synthetic_trace(s, seed, i, traces, x, g);
    for (size_t j = 0; j < n; j++) {
      double row[2] = {x[j], g[j]};
      fwrite(row, sizeof row, 1, file);
    }
  }
  return fclose(file) == 0;
}

/* A signal that switches between levels g0[states] with mean dwells dwell_s
 * (exponential, continuous in time); a sample is the mean over its time.  From
 * a level the next is any other with equal probability. */
typedef struct {
  int states;
  double g0[3], dwell_s[3], noise_g0, drift_g0; /* drift over the whole */
  double sampling_s;
} synthetic_telegraph;

static inline void synthetic_signal(const synthetic_telegraph *s, uint64_t seed, size_t n,
                                    double *g)
{
  mho_random random = mho_random_stream(seed, 0);
  int state = 0;
  double left = -s->dwell_s[0] * log(synthetic_uniform(&random));
  for (size_t i = 0; i < n; i++) {
    double rest = s->sampling_s, sum = 0.0;
    while (s->states > 1 && left < rest) {
      sum += left * s->g0[state];
      rest -= left;
      int step = 1 + (int)mho_random_below(&random, (uint64_t)(s->states - 1));
      state = (state + step) % s->states;
      left = -s->dwell_s[state] * log(synthetic_uniform(&random));
    }
    sum += rest * s->g0[state];
    left -= rest;
    g[i] = sum / s->sampling_s + s->noise_g0 * synthetic_normal(&random) +
           s->drift_g0 * (double)i / (double)n;
  }
}

#endif
