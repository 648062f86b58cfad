/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Maximum likelihood for binned counts: minimises sum(rate - c ln rate) by
 * Fisher scoring with Levenberg's damping, parameters held within bounds.
 * (D. W. Marquardt, J. Soc. Ind. Appl. Math. 11, 431 (1963); the expected
 * information sum J J^T/rate stands for the Hessian.)
 */
#ifndef MHOLECULE_MEASURE_FIT_H
#define MHOLECULE_MEASURE_FIT_H

#include <stdbool.h>

enum { MHO_FIT_PARAMETERS = 32 };

/* Fills rate[bins] and, unless NULL, jacobian[bins * n]. */
typedef void (*mho_rate_model)(const void *context, const double *parameter,
                               double *rate, double *jacobian);

typedef struct {
  mho_rate_model model;
  const void *context;
  int bins, parameters;
  double lower[MHO_FIT_PARAMETERS], upper[MHO_FIT_PARAMETERS];
} mho_fit_problem;

/* Doubles that a fit works in. */
#define MHO_FIT_WORK(bins, parameters) ((size_t)(bins) * (size_t)((parameters) + 1))

/* Improves parameter[n]; returns the deviance sum(rate - c ln rate), not
 * finite where the start is of no use. */
double mho_fit_counts(const mho_fit_problem *problem, const double *count,
                      double *parameter, double *work);

#endif
