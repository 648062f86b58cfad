/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Derivatives of ln T, all from one solve a channel: with A = E - H - Sigma,
 * y_c = A^-1 v_c and tau_ba = v_b^T y_a (one channel a side),
 *
 *   dlnT/d eps_i = 2 Re[y_b,i y_a,i / tau],
 *   dlnT/d t_ij  = 2 Re[(y_b,i y_a,j + y_b,j y_a,i) / tau],
 *
 * and so on; they answer "which site, bond or contact decides this value?".
 */
#ifndef MHOLECULE_GRADIENT_H
#define MHOLECULE_GRADIENT_H

#include <mho/transmission.h>

typedef struct {
  int sites, left, right; /* channels of the contacts */
  size_t pairs;
  int (*pair)[2];   /* sites of the hoppings that are asked for */
  double *onsite;   /* dlnT/d eps_i, 1/eV [sites] */
  double *hopping;  /* dlnT/d t_ij, H_ij and H_ji together, 1/eV [pairs] */
  double *coupling; /* dlnT/d Gamma_c, 1/eV [left + right] */
  double energy;    /* dlnT/dE, 1/eV */
  double kappa;     /* sum of |p dlnT/dp| over H, Gamma and E */
  mho_point point;  /* T itself; at a node all derivatives are 0 */
} mho_gradient;

MHO_BEGIN_DECLARATIONS

/* Room for the derivatives of a plan; pair[pairs] chooses the hoppings, also
 * ones that are zero.  NULL: every non-zero hopping of H.
 * Errors: MHO_ERR_SIZE (a pair), MHO_ERR_MEMORY. */
MHO_API MHO_MUST_USE mho_status mho_gradient_create(const mho_plan *plan,
                                                    const int (*pair)[2],
                                                    size_t pairs,
                                                    mho_gradient **gradient,
                                                    mho_error *error);
MHO_API void mho_gradient_free(mho_gradient *gradient);

/* Fills the gradient at an energy.  p dlnT/dp is right to 1e-9 (1 + kappa):
 * elimination in double where a step of refinement confirms it, else in 113
 * bits.  Errors: MHO_ERR_NOT_FINITE, MHO_ERR_MEMORY. */
MHO_API MHO_MUST_USE mho_status mho_gradient_evaluate(const mho_plan *plan,
                                                      double energy_ev,
                                                      mho_gradient *gradient,
                                                      mho_error *error);

MHO_END_DECLARATIONS

#endif
