/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What of P(E) = v_r^T adj(E - H) v_l is decided by integers: how many states
 * the contacts see, how many poles g = v_r^T (E - H)^-1 v_l keeps, how fast it
 * falls.  Rounding cannot tell a state seen by 1e-17 from one that is not.
 */
#ifndef MHOLECULE_SOLVER_EXACT_H
#define MHOLECULE_SOLVER_EXACT_H

#include "solver/plan.h"

typedef struct {
  int visible;     /* dimension of all that H makes of v_l and v_r */
  int poles;       /* of g in lowest terms; 0: g = 0 */
  int first;       /* least j with v_r^T H^j v_l != 0 */
} mho_exact_counts;

/* For one channel a contact.  Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_exact_count(const mho_plan *plan, mho_exact_counts *counts);

#endif
