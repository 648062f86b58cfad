/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Zeros of P(E) as those of the links of its chain (chain.h), each kind of link
 * solved once: a node of order six of six rings is six times a simple one.
 */
#ifndef MHOLECULE_SOLVER_FACTORS_H
#define MHOLECULE_SOLVER_FACTORS_H

#include <mho/nodes.h>

#include "solver/exact.h"

/* As mho_nodes_find, for one channel a contact on a connected, diagonalised plan.
 * *sure is false, and result empty, where the molecule is one link, or where it is
 * not sure which states cancel that no link has by itself; the caller clears the
 * result.  patient as in mho_nodes_search. */
MHO_MUST_USE mho_status mho_factors_find(const mho_plan *plan, const mho_exact_counts *counts,
                                         bool patient, mho_nodes *result, bool *sure,
                                         mho_error *error);

#endif
