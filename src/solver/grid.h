/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Energies that are dense where T changes.
 */
#ifndef MHOLECULE_SOLVER_GRID_H
#define MHOLECULE_SOLVER_GRID_H

#include <mho/nodes.h>

#include "solver/plan.h"

/* A place on the energy axis and the scale on which T changes there. */
typedef struct {
  double energy_ev, width_ev;
} mho_feature;

/* The poles (those within [low, high] are enough) and the edges of a band, with
 * room for more behind them: *count of them.  The caller frees *feature. */
MHO_MUST_USE mho_status mho_pole_features(const mho_plan *plan, double low_ev, double high_ev,
                                          size_t room, mho_feature **feature, size_t *count,
                                          mho_error *error);

/* `even` points from low to high and more around every feature. */
MHO_MUST_USE mho_status mho_feature_grid(const mho_feature *feature, size_t features,
                                         double low_ev, double high_ev, int even,
                                         double **energy_ev, size_t *count,
                                         mho_error *error);

#endif
