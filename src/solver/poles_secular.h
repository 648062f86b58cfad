/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef MHOLECULE_SOLVER_POLES_SECULAR_H
#define MHOLECULE_SOLVER_POLES_SECULAR_H

#include <complex.h>

#include "solver/plan.h"

/* Poles of a diagonalised molecule with one channel a contact, as zeros of its
 * secular polynomial: value[sites], and the overlaps v_c.x of the normalised
 * states, overlap[sites][2].  *good is false where they are not certain to
 * 1e-12 ||H|| (levels that nearly coincide): then the general eigensolver has
 * to do it.  Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_poles_secular(const mho_plan *plan, double complex *value,
                                          double complex (*overlap)[2], bool *good);

#endif
