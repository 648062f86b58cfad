/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * g(z) = v_r^T (z - H)^-1 v_l of the bare molecule at a complex energy, exact
 * to far more than its conditioning allows a double to be.
 */
#ifndef MHOLECULE_SOLVER_BARE_H
#define MHOLECULE_SOLVER_BARE_H

#include <complex.h>

#include "solver/plan.h"

typedef struct mho_bare mho_bare;

typedef struct {
  double complex value, slope; /* g, g' */
  double complex own[2], own_slope[2]; /* v_c^T (z - H)^-1 v_c and slope, each contact */
  double noise, slope_noise;   /* what they may be wrong by */
} mho_bare_green;

/* For one channel a contact; NULL without memory. */
mho_bare *mho_bare_create(const mho_plan *plan);
void mho_bare_free(mho_bare *bare);

/* False where z - H is singular to rounding. */
bool mho_bare_evaluate(mho_bare *bare, double complex z, mho_bare_green *green);

/* The same to some 30 digits less those that its conditioning takes, in ten times
 * the time: beside levels that no contact sees.  `own` is not filled. */
bool mho_bare_evaluate_fine(mho_bare *bare, double complex z, mho_bare_green *green);

/* T of a plan like that of creation but for Gamma and shift, with contacts of one
 * site each and v = 1 there: the same of z - H - Sigma. */
void mho_bare_transmission(mho_bare *bare, const mho_plan *plan, double energy_ev,
                           mho_estimate *estimate);

#endif
