/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Local minima of T(E), for contacts of several channels and for molecules too
 * large for the zeros of a polynomial.
 */
#ifndef MHOLECULE_SOLVER_MINIMA_H
#define MHOLECULE_SOLVER_MINIMA_H

#include <mho/nodes.h>

/* Over the range of the poles; adds to an empty result. */
MHO_MUST_USE mho_status mho_minima_find(const mho_plan *plan, mho_nodes *result,
                                        mho_error *error);

#endif
