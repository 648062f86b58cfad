/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Levels of a small molecule and what the contacts' vectors are in its orbitals,
 * without the orbitals.
 */
#ifndef MHOLECULE_SOLVER_ROWS_H
#define MHOLECULE_SOLVER_ROWS_H

#include "solver/plan.h"

enum { ROWS_SITES_MAX = 64 }; /* a multiple of 8 */

/* For a plan of one channel a contact and at most ROWS_SITES_MAX sites.
 * level_ev[sites] ascends; amplitude[sites][2] are the products of the channels'
 * vectors with the orbitals, whose signs are free.  False for a largest
 * element beyond 1e-30 .. 1e30 eV, or if the iteration does not end. */
MHO_MUST_USE bool mho_rows_diagonalise(const mho_plan *plan, double *level_ev,
                                       double (*amplitude)[2]);

#endif
