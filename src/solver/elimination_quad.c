/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "solver/plan.h"
#include "solver/quad.h"

#define REAL mho_quad
#define ROUNDOFF QUAD_ROUNDOFF
#define SMALLEST 0
#define TRUST_RANK true
#define NAME(x) x##_quad
#include "solver/elimination.inc"

void mho_elimination_solutions_quad(const mho_plan *plan, const mho_elimination_quad *w,
                                    double _Complex *solution)
{
  for (size_t k = 0; k < (size_t)plan->channels * w->n; k++) {
    __real__ solution[k] = (double)scaled_quad(w->y_re[k], w->y_scale[k]);
    __imag__ solution[k] = (double)scaled_quad(w->y_im[k], w->y_scale[k]);
  }
}

double mho_elimination_flow_quad(const mho_plan *plan, const mho_elimination_quad *w, int i, int j)
{
  mho_quad sum = 0;
  for (size_t a = 0; a < (size_t)plan->left; a++) {
    size_t p = a * w->n + (size_t)i, q = a * w->n + (size_t)j;
    mho_quad imaginary = w->y_im[p] * w->y_re[q] - w->y_re[p] * w->y_im[q];
    sum += (mho_quad)plan->coupling_ev[a] *
           scaled_quad(imaginary, w->y_scale[p] + w->y_scale[q]);
  }
  return (double)sum;
}
