/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Zeros of P(E) in double precision, each held to an evaluation in twice that.
 */
#ifndef MHOLECULE_SOLVER_ZEROS_H
#define MHOLECULE_SOLVER_ZEROS_H

#include <mho/nodes.h>

#include "solver/exact.h"

/* As mho_nodes_find; MHO_ERR_NOT_CONVERGED in place of the search in 113 bits,
 * minutes for hundreds of sites, unless patient. */
MHO_MUST_USE mho_status mho_nodes_search(const mho_plan *plan, bool patient, mho_nodes *result,
                                         mho_error *error);

/* The same for a plan with one channel a contact and levels, as one, in no order. */
MHO_MUST_USE mho_status mho_nodes_of_block(const mho_plan *plan, const mho_exact_counts *counts,
                                           bool patient, mho_nodes *result, mho_error *error);

/* Nodes for one channel a contact on a diagonalised plan, in no order, appended
 * to result->node (room for one a site).  *sure is false, and nothing is
 * appended, where doubles cannot tell one zero from another.
 * Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_zeros_find(const mho_plan *plan, const mho_exact_counts *counts,
                                       mho_nodes *result, bool *sure, mho_error *error);

#endif
