/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Gaussians in log10 G on a plateau: the shape of a conductance histogram.
 *
 * rate(x) = sum_k [A_k N(x; mu_k, sigma_k) + a_k Phi((mu_k - d_k - x)/sigma_k)]
 *         + h/2 [erf((x - l)/(sqrt2 s_l)) - erf((x - r)/(sqrt2 s_r))] e^(t(x - c))
 * integrated over the bins; c is the middle of the window and r - l at least
 * half of it and a decade, and l at most half a decade inside, for the background
 * reaches down to the floor: so the plateau cannot pass for a peak.  The edges are soft
 * because the jump out of contact and the end of the trace scatter normally
 * in log10 G.  The tail a_k below a Gaussian is what its traces leave on their
 * way from the plateau down to the floor; without it a peak is drawn towards
 * the floor.
 */
#ifndef MHOLECULE_MEASURE_MIXTURE_H
#define MHOLECULE_MEASURE_MIXTURE_H

#include "measure/fit.h"

enum { MHO_GAUSSIAN_PARAMETERS = 5, MHO_PLATEAU_PARAMETERS = 6 };

/* A Gaussian's parameters are ln A, mu, ln sigma, ln a, d; the plateau's, which come
 * last, ln h, l, r - l, ln s_l, ln s_r, t. */
typedef struct {
  int bins, gaussians;
  const double *edge;
} mho_mixture;

/* Parameters of a mixture of n Gaussians. */
#define MHO_MIXTURE_PARAMETERS(n) \
  (MHO_GAUSSIAN_PARAMETERS * (n) + MHO_PLATEAU_PARAMETERS)

mho_fit_problem mho_mixture_problem(const mho_mixture *mixture);

/* A plateau over the whole window that holds `total` counts. */
void mho_mixture_flat(const mho_mixture *mixture, double total, double *parameter);

/* Density per decade at x. */
double mho_mixture_density(const mho_mixture *mixture, const double *parameter, double x);

/* Height of the local maximum at Gaussian k over its higher flank, relative
 * to that flank; 0 where there is none. */
double mho_mixture_prominence(const mho_mixture *mixture, const double *parameter, int k);

#endif
