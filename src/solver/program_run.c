/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A compiled elimination over a batch of energies, and back.  For every pivot d
 * and pair (i, j) of its row a,
 *
 *   w = -1/d,   s' = s + a_i w a_j,
 *
 * in double-double after T. J. Dekker, Numer. Math. 18, 224 (1971), with products by
 * fused multiply-add; bounds of such operations are in M. Joldes, J.-M. Muller and
 * V. Popescu, ACM Trans. Math. Softw. 44, 15 (2017).  With u = 2^-53 and every number
 * normalised, w errs by at most 8 u^2, a_i w by 8 u^2 and (a_i w) a_j by 12 u^2 of
 * their moduli, the sum by u^2 (4 |s'| + 21 |a_i w a_j|), cancellation included: in
 * all by less than
 *
 *   UNIT (6.5 |a_i w a_j| + |s'|),   UNIT = 8 u^2 = 2^-103.
 *
 * ln T changes by adjoint(s') times that, to first order (S. Linnainmaa, BIT 16, 146
 * (1976)).  Going back, the answer r_k of site k to each kept site (the kept sites'
 * own: one and zero) follows by substitution, r_k = w sum_i a_i r_i.  The Schur
 * complement is the quadratic form of M on the answers, so at every stage of m
 *
 *   adjoint(m_ij) = r_i^T Q r_j,   adjoint(m_ii) = r_i^T Q r_i / 2
 *
 * with Q_cd the adjoint of the Schur complement's (c, d), twice that for c = d.
 * Moduli bound it: with R = sum_i |a_i| |r_i|, and <x, y> the form of |Q|, the products
 * of a step weigh |w| <R, R> / 2, so no pair need be visited.  Of a number rounded
 * m times, as none is more than `roundings`,
 *
 *   |s_1| + .. + |s_m| <= m (|s_m| + sum_l |a w a|_l),
 *
 * and the last values weigh <R, r> and d <r, r> / 2 in the step that eliminates them:
 * with |r| <= |w| R, 3/2 |w| <R, R>.  Next to levels of the inner sites the answers
 * are large and cancel, and this is too large by the square of the inverse distance;
 * between 2^-103 and the contract is room for both.
 */
#include <stdlib.h>
#include <sys/mman.h>

#include "solver/lanes.h"
#include "solver/program.h"

enum { LARGE_PAGE = 1 << 21 };

mho_status mho_program_trace_create(const mho_program *program, mho_program_trace *trace)
{
  size_t run = (size_t)program->lanes, slots = ((size_t)program->slots + 1) * run;
  size_t responses = slots * (size_t)program->kept;
  size_t bytes = (2 * slots + responses + program->taped * run) * sizeof(double);
  size_t page = bytes > LARGE_PAGE ? LARGE_PAGE : 64;
  trace->number = aligned_alloc(page, (bytes + page - 1) / page * page);
  if (!trace->number) return MHO_ERR_MEMORY;
#ifdef MADV_HUGEPAGE
  if (page == LARGE_PAGE) (void)madvise(trace->number, bytes, MADV_HUGEPAGE); /* only a hint */
#endif
  trace->response = trace->number + 2 * slots;
  trace->tape = trace->response + responses;
  return MHO_OK;
}

void mho_program_trace_clear(mho_program_trace *trace)
{
  free(trace->number);
  *trace = (mho_program_trace){0};
}

void mho_program_forward(const mho_program *program, const double *energy_ev, size_t count,
                         double norm_ev, mho_program_trace *trace)
{
  OF_WIDEST(mho_program_forward)(program, energy_ev, count, norm_ev, trace);
}

void mho_program_backward(const mho_program *program, const double *energy_ev,
                          mho_program_trace *trace)
{
  OF_WIDEST(mho_program_backward)(program, energy_ev, trace);
}
