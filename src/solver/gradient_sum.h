/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef MHOLECULE_SOLVER_GRADIENT_SUM_H
#define MHOLECULE_SOLVER_GRADIENT_SUM_H

#include <mho/gradient.h>

/* Weighted sum of the derivatives of ln T at energy_ev[count], into the onsite,
 * hopping, coupling and energy of `sum`; transmission[count] is known (0 where it
 * underflows), and nodes are left out.  Many energies at a time by reduction.h
 * where that finds the same T and the derivatives hold Euler's identity,
 * sum p dlnT/dp = 0 (scaling all energies leaves T unchanged); else one by one.
 * Errors: as mho_gradient_evaluate. */
MHO_MUST_USE mho_status mho_gradient_sum(const mho_plan *plan, size_t count,
                                         const double *energy_ev, const double *transmission,
                                         const double *weight, mho_gradient *sum,
                                         mho_error *error);

#endif
