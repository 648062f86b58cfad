/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Sums over the levels of the bare molecule; spectrum.c says how far they hold.
 */
#ifndef MHOLECULE_SOLVER_SPECTRUM_H
#define MHOLECULE_SOLVER_SPECTRUM_H

#include "solver/plan.h"

enum { SPECTRUM_LANES = 16 };

/* Practice, not proof: of 600 000 energies of random molecules of 4 to 36 sites, half of
 * them next to a level, none was off by more than 12 u (||H|| + |E|) times the norms. */
#define SPECTRUM_EIGEN_CONSTANT 20
#define SPECTRUM_SUM_CONSTANT 8

/* Nearer to a level than this (times ||H||) first order says nothing. */
#define SPECTRUM_NEAREST 1e-9

/* At one energy, for any number of channels up to SPECTRUM_CHANNELS_MAX. */
void mho_spectrum_evaluate(const mho_plan *plan, double energy_ev,
                           mho_estimate *estimate);

typedef struct {
  double transmission[SPECTRUM_LANES], log10_transmission[SPECTRUM_LANES];
  double relative_error[SPECTRUM_LANES]; /* huge or NaN where the sums cannot tell */
} mho_spectrum_batch;

/* At energy_ev[SPECTRUM_LANES] for one channel a contact. */
void mho_spectrum_evaluate_pair(const mho_plan *plan, const double *energy_ev,
                                mho_spectrum_batch *batch);

/* What that needs of the levels, w w^T of their amplitudes: sums over 1/(E - eps), over
 * its square, and of the square alone, which tells how near a level is. */
typedef struct {
  double f00[SPECTRUM_LANES], f01[SPECTRUM_LANES], f11[SPECTRUM_LANES];
  double s00[SPECTRUM_LANES], s01[SPECTRUM_LANES], s11[SPECTRUM_LANES];
  double squares[SPECTRUM_LANES];
} mho_spectrum_sums;

/* For vectors of so many energies; spectrum_lanes.inc. */
#define SPECTRUM_OF_WIDTH(width)                                                   \
  void mho_spectrum_sum_##width(const mho_plan *plan, const double *energy_ev,     \
                                mho_spectrum_sums *sums);
SPECTRUM_OF_WIDTH(2)
SPECTRUM_OF_WIDTH(4)
SPECTRUM_OF_WIDTH(8)
#undef SPECTRUM_OF_WIDTH

#endif
