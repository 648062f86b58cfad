/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * T of many molecules that have the bonds of one plan and numbers of their own,
 * many at a time: the plan's compiled elimination with a number for every lane.
 * For samples of uncertain parameters, which need some digits and no bounds.
 */
#ifndef MHOLECULE_SOLVER_SAMPLER_H
#define MHOLECULE_SOLVER_SAMPLER_H

#include "solver/plan.h"

enum { SAMPLER_LANES = 16 };

/* Numbers of SAMPLER_LANES molecules, one a lane. */
typedef struct {
  double *value;    /* H, [loads][lanes] in the order of program->load */
  double *coupling; /* Gamma, [channels][lanes] */
  double energy_ev[SAMPLER_LANES];
} mho_sample_batch;

typedef struct {
  const mho_plan *plan;
  double *slot;                    /* [slots][lanes] */
  mho_plan contacts;               /* of one lane */
  double *coupling;                /* [channels], its */
  mho_elimination_double *reduced; /* NULL for one site a contact */
} mho_sampler;

/* Can samples of a plan be evaluated so? */
bool mho_sampler_serves(const mho_plan *plan);

/* The plan must outlive the sampler, which belongs to one thread.  clear frees
 * an all-zero one, too.  Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_sampler_init(const mho_plan *plan, mho_sampler *sampler);
void mho_sampler_clear(mho_sampler *sampler);

MHO_MUST_USE mho_status mho_sample_batch_init(const mho_plan *plan, mho_sample_batch *batch);
void mho_sample_batch_clear(mho_sample_batch *batch);

/* T at energy_ev + offset_ev of every lane; broken[lane] is set (never unset)
 * where a pivot left fewer than eight digits or so. */
void mho_sampler_evaluate(mho_sampler *sampler, const mho_sample_batch *batch, double offset_ev,
                          double *transmission, bool *broken);

#endif
