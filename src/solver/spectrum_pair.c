/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * spectrum.c for one channel a contact, many energies at a time.  With M = 1 -
 * Sigma F of two rows, K = M^-1 by Cramer's rule, whose error is that of
 * changing the entries of M by rounding:
 *
 *   D = M_00 M_11 - M_01 M_10,   g_10 = F_01 / D,
 *   K = [[M_11, sigma_0 F_01], [sigma_1 F_01, M_00]] / D,
 *   g_11 = (F_11 M_00 + sigma_0 F_01^2) / D.
 *
 * Moduli are bounded by |re| + |im|, sums of moduli of F's terms by
 * |w|^2 = 1 and Cauchy's inequality: sum |w_a w_a / (E - eps)| <= sqrt(S_aa).
 */
#include <math.h>

#include "base/processor.h"
#include "solver/lanes.h"
#include "solver/logarithm.h"
#include "solver/spectrum.h"

enum { L = SPECTRUM_LANES };

/* T and its relative error from the sums; without a branch, so that it becomes
 * vectors everywhere. */
FOR_EVERY_PROCESSOR
static void combine(const mho_plan *plan, const double *energy_ev, const mho_spectrum_sums *t,
                    mho_spectrum_batch *batch)
{
  double nearest = 1 / (SPECTRUM_NEAREST * plan->norm_ev);
  double x0 = plan->shift_ev[0], y0 = -0.5 * plan->coupling_ev[0];
  double x1 = plan->shift_ev[1], y1 = -0.5 * plan->coupling_ev[1];
  double size0 = fabs(x0) + fabs(y0), size1 = fabs(x1) + fabs(y1);
  double square0 = x0 * x0 + y0 * y0, square1 = x1 * x1 + y1 * y1;
  double weight = plan->coupling_ev[0] * plan->coupling_ev[1], norm = plan->norm_ev;
  double limit = nearest * nearest;
#pragma GCC ivdep
  for (int l = 0; l < L; l++) {
    double f0 = t->f00[l], f = t->f01[l], f1 = t->f11[l], size = fabs(f);
    double m0_re = 1.0 - x0 * f0, m0_im = -y0 * f0; /* M_00 */
    double m1_re = 1.0 - x1 * f1, m1_im = -y1 * f1; /* M_11 */
    double square = f * f;
    double d_re = m0_re * m1_re - m0_im * m1_im - (x0 * x1 - y0 * y1) * square;
    double d_im = m0_re * m1_im + m0_im * m1_re - (x0 * y1 + y0 * x1) * square;
    double inverse = 1.0 / (d_re * d_re + d_im * d_im);
    /* |K| and |g|, times |D| */
    double k00 = fabs(m1_re) + fabs(m1_im), k11 = fabs(m0_re) + fabs(m0_im);
    double k01 = size0 * size, k10 = size1 * size, g11 = fabs(f1) * k11 + size0 * square;
    /* |K_p1| |F|_pq |K_q0| + |g_1p| (1 + |sigma_p| |F|)_pq |K_q0| */
    double a0 = sqrt(t->s00[l]), a1 = sqrt(t->s11[l]), a = 0.5 * (a0 + a1);
    double to0 = a0 * k00 + a * k10, to1 = a * k00 + a1 * k10;
    double rounding = k01 * to0 + k11 * to1 + size * (k00 + size0 * to0) +
                      g11 * (k10 + size1 * to1);
    /* |G v_a|^2 = (K^dagger S K)_aa with K_00 = m1 / D, K_10 = sigma_1 f / D */
    double s0 = t->s00[l], s = 2 * t->s01[l] * f, s1 = t->s11[l];
    double u0 = s0 * (m1_re * m1_re + m1_im * m1_im) + s1 * square1 * square +
                s * (m1_re * x1 + m1_im * y1);
    double u1 = s1 * (m0_re * m0_re + m0_im * m0_im) + s0 * square0 * square +
                s * (m0_re * x0 + m0_im * y0);
    double scale = SPECTRUM_EIGEN_CONSTANT * UNIT_ROUNDOFF * (norm + fabs(energy_ev[l]));
    double error = SPECTRUM_SUM_CONSTANT * UNIT_ROUNDOFF * rounding + scale * sqrt(fabs(u0 * u1));
    /* of g_10: error |1/D|^2 against |f / D| */
    double relative = 2 * error * sqrt(inverse) / size + 8 * UNIT_ROUNDOFF;
    double transmission = weight * square * inverse;
    int unsure = (t->squares[l] > limit) | (transmission < 1e-280);
    batch->transmission[l] = transmission;
    batch->log10_transmission[l] = log10_of_normal(transmission);
    batch->relative_error[l] = relative + 1e300 * unsure;
  }
}

void mho_spectrum_evaluate_pair(const mho_plan *plan, const double *energy_ev,
                                mho_spectrum_batch *batch)
{
  mho_spectrum_sums t;
  OF_WIDEST(mho_spectrum_sum)(plan, energy_ev, &t);
  combine(plan, energy_ev, &t, batch);
}
