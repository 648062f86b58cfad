/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * One pull: its alignment, the reason to reject it, its plateaus.
 */
#ifndef MHOLECULE_MEASURE_PULL_H
#define MHOLECULE_MEASURE_PULL_H

#include <mho/histogram.h>

enum { MHO_PULL_LIMIT = 1 << 22 }; /* points that are kept for alignment */

typedef struct {
  size_t count, capacity;
  double *g0, *x; /* x in nm */
  int32_t *slot;  /* of mho_logbin */
} mho_pull;

/* Room for `more` points; false without memory. */
MHO_MUST_USE bool mho_pull_reserve(mho_pull *pull, size_t more);
void mho_pull_clear(mho_pull *pull);

/* Index of the last point at or above `crossing` whose successor lies below,
 * and where between them the crossing is; false without one. */
bool mho_pull_align(const mho_pull *pull, double crossing_g0, size_t *index,
                    double *zero_nm);

/* Longest displacement behind point `start` within any window of `window`
 * slots between slots first and last. */
double mho_pull_longest_stay(const mho_pull *pull, size_t start, int first,
                             int last, int window, double *spent);

/* Plateaus behind point `start` and above floor_g0; at most `limit`. */
size_t mho_pull_plateaus(const mho_pull *pull, size_t start, double floor_g0,
                         const mho_histogram_options *options,
                         mho_plateau *plateau, size_t limit);

#endif
