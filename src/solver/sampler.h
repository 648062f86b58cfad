/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * T of many molecules that have the bonds of one plan and numbers of their own,
 * for samples of uncertain parameters, which need some digits and no bounds.
 */
#ifndef MHOLECULE_SOLVER_SAMPLER_H
#define MHOLECULE_SOLVER_SAMPLER_H

#include "solver/reduction.h"

enum { SAMPLER_LANES = REDUCTION_LANES / 2 };

/* Numbers of SAMPLER_LANES molecules, one a lane. */
typedef struct {
  double *value_ev; /* H, [slots][lanes] */
  double *coupling; /* Gamma, [channels][lanes] */
  double energy_ev[SAMPLER_LANES];
} mho_sample_batch;

typedef struct {
  const mho_plan *plan;
  mho_reduction *reduction;        /* NULL: samples cannot be evaluated so */
  double *number;                  /* [slots][2][lanes] */
  mho_plan contacts;               /* of one lane */
  double *coupling;                /* [channels], its */
  mho_elimination_double *reduced; /* NULL for one site a contact */
} mho_sampler;

/* The plan must outlive the sampler, which belongs to one thread.  clear frees
 * an all-zero one, too.  Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_sampler_init(const mho_plan *plan, mho_sampler *sampler);
void mho_sampler_clear(mho_sampler *sampler);

MHO_MUST_USE mho_status mho_sample_batch_init(const mho_sampler *sampler,
                                              mho_sample_batch *batch);
void mho_sample_batch_clear(mho_sample_batch *batch);

/* T(energy_ev - offset_ev) + T(energy_ev + offset_ev) of the first `lanes` lanes;
 * broken[lane] is set (never unset) where a pivot left fewer than six digits or
 * so.  What other lanes get means nothing. */
void mho_sampler_evaluate(mho_sampler *sampler, const mho_sample_batch *batch, int lanes,
                          double offset_ev, double *transmission, bool *broken);

#endif
