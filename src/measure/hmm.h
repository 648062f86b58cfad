/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Hidden Markov model with Gaussian emissions, on blocks of a signal.
 */
#ifndef MHOLECULE_MEASURE_HMM_H
#define MHOLECULE_MEASURE_HMM_H

#include <mho/telegraph.h>

enum { MHO_STATES = MHO_LEVEL_LIMIT };

typedef struct {
  int states;
  double mean[MHO_STATES], deviation[MHO_STATES]; /* ascending in the mean */
  double start[MHO_STATES];
  double go[MHO_STATES][MHO_STATES]; /* probability a sample, from and to */
} mho_hmm;

/* Equal pieces of a signal that estimation uses. */
typedef struct {
  size_t count, length;
  const double **block; /* [count] */
} mho_blocks;

/* Estimates a model of `states` levels from the blocks whose index modulo 2
 * is `parity` (2: from all).  The same at any number of threads.
 * Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_hmm_estimate(const mho_blocks *blocks, int parity, int states,
                                         mho_hmm *model);

/* Log likelihood of every block of a parity, into likelihood[count]. */
MHO_MUST_USE mho_status mho_hmm_score(const mho_blocks *blocks, int parity,
                                      const mho_hmm *model, double *likelihood);

/* The most likely path of a signal; back[n] is work. */
void mho_hmm_path(const mho_hmm *model, const double *signal, size_t n, uint8_t *back,
                  uint8_t *path);

#endif
