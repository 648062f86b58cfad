/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The finite zeros of P(E) = v_r^T adj(E - H) v_l as the eigenvalues of a
 * matrix in upper Hessenberg form; and that polynomial, up to a constant.
 */
#ifndef MHOLECULE_SOLVER_PENCIL_H
#define MHOLECULE_SOLVER_PENCIL_H

#include "solver/plan.h"
#include "solver/quad.h"

typedef struct {
  int size;         /* number of finite zeros */
  int visible;      /* states that a contact sees */
  bool everywhere;  /* P = 0 */
  mho_quad norm;    /* largest entry of H */
  mho_quad *matrix; /* [size][size], upper Hessenberg */
  int blocks;       /* it falls apart where a subdiagonal is zero */
  int *block;       /* [blocks + 1]: first row of each */
} mho_pencil;

MHO_MUST_USE mho_status mho_pencil_create(const mho_plan *plan, mho_pencil *pencil);
void mho_pencil_clear(mho_pencil *pencil);

/* Determinant of a block minus z, over the product of its subdiagonal, and its
 * derivative (J. H. Wilkinson, The Algebraic Eigenvalue Problem, section 7.11:
 * Hyman's method).  work has room for twice the block. */
void mho_pencil_evaluate(const mho_pencil *pencil, int block, mho_quad_complex z,
                         mho_quad_complex *work, mho_quad_complex *value,
                         mho_quad_complex *derivative);

/* Rounding error of that value to first order; room for three times the block. */
mho_quad mho_pencil_noise(const mho_pencil *pencil, int block, mho_quad_complex z,
                          mho_quad_complex *work);

#endif
