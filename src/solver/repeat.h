/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Long molecules of equal units that one bond each joins: a run of 2^k of them
 * is reduced to its two ends in k steps, in 113 bits; repeat.c.
 */
#ifndef MHOLECULE_SOLVER_REPEAT_H
#define MHOLECULE_SOLVER_REPEAT_H

#include "solver/plan.h"

enum { REPEAT_UNIT_MAX = 64, REPEAT_REST_MAX = 24 };

/* E - H of `units` equal units is taken as that of two sites, numbers rest and
 * rest + 1 of the plan of what is left. */
struct mho_repeat {
  int unit, units, in, out; /* sites of one; where its neighbours are bound */
  double *hamiltonian_ev;   /* [unit][unit] */
  double joint_ev;          /* H between neighbours */
  int rest;                 /* sites that are no part of the run */
  double *rest_ev;          /* [rest + 2][rest + 2], the ends' own 2 x 2 left out */
  mho_plan *plan;           /* of rest and ends */
};

/* *repeat is NULL where the molecule is no such run with a few sites around.
 * Needs neighbours and channels of the plan.  Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_repeat_create(const mho_plan *plan, mho_repeat **repeat);
void mho_repeat_free(mho_repeat *repeat);

/* At one energy; the workspace is one of repeat->plan. */
void mho_repeat_evaluate(const mho_repeat *repeat, mho_elimination_quad *workspace,
                         double energy_ev, mho_estimate *estimate);

#endif
