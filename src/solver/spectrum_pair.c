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
 * Moduli are bounded by |re| + |im|.
 */
#include <math.h>
#include <string.h>

#include "solver/logarithm.h"
#include "solver/plan.h"
#include "base/processor.h"
#include "solver/spectrum.h"

enum { L = SPECTRUM_LANES, V = 8 };

typedef struct {
  double f00[L], f01[L], f11[L];    /* F */
  double a00[L], a01[L], a11[L];    /* sums of moduli of its terms */
  double s00[L], s01[L], s11[L];    /* sum w w^T / (E - eps)^2 */
  double squares[L];                /* sum 1 / (E - eps)^2: how near a level is */
} sums;

typedef double vector __attribute__((vector_size(V * sizeof(double))));
typedef long long mask __attribute__((vector_size(V * sizeof(double))));

#define ABSOLUTE(x) ((vector)((mask)(x) & (0 * (mask){0} + 0x7fffffffffffffffLL)))

/* V energies at a time, so that with wide vectors all sums stay in registers. */
FOR_EVERY_PROCESSOR
static void sum_levels(const mho_plan *plan, const double *energy_ev, sums *t)
{
  for (int at = 0; at < L; at += V) {
    vector e, f00 = {0}, f01 = {0}, f11 = {0}, a00 = {0}, a01 = {0}, a11 = {0};
    vector s00 = {0}, s01 = {0}, s11 = {0}, squares = {0};
    memcpy(&e, energy_ev + at, sizeof e);
    for (const mho_pole_pair *k = plan->pair, *end = k + plan->sites; k < end; k++) {
      vector inverse = 1.0 / (e - k->level_ev);
      vector p = k->w00 * inverse, q = k->w01 * inverse, r = k->w11 * inverse;
      f00 += p;
      f01 += q;
      f11 += r;
      a00 += ABSOLUTE(p);
      a01 += ABSOLUTE(q);
      a11 += ABSOLUTE(r);
      s00 += p * inverse;
      s01 += q * inverse;
      s11 += r * inverse;
      squares += inverse * inverse;
    }
    memcpy(t->f00 + at, &f00, sizeof e);
    memcpy(t->f01 + at, &f01, sizeof e);
    memcpy(t->f11 + at, &f11, sizeof e);
    memcpy(t->a00 + at, &a00, sizeof e);
    memcpy(t->a01 + at, &a01, sizeof e);
    memcpy(t->a11 + at, &a11, sizeof e);
    memcpy(t->s00 + at, &s00, sizeof e);
    memcpy(t->s01 + at, &s01, sizeof e);
    memcpy(t->s11 + at, &s11, sizeof e);
    memcpy(t->squares + at, &squares, sizeof e);
  }
}

/* T and its relative error from the sums. */
FOR_EVERY_PROCESSOR
static void combine(const mho_plan *plan, const double *energy_ev, const sums *t,
                    mho_estimate *estimate)
{
  double transmission[L], log10_transmission[L], relative_error[L];
  double nearest = SPECTRUM_NEAREST * plan->norm_ev;
  double x0 = plan->shift_ev[0], y0 = -0.5 * plan->coupling_ev[0];
  double x1 = plan->shift_ev[1], y1 = -0.5 * plan->coupling_ev[1];
  double size0 = fabs(x0) + fabs(y0), size1 = fabs(x1) + fabs(y1);
  double weight = plan->coupling_ev[0] * plan->coupling_ev[1], norm = plan->norm_ev;
#pragma GCC ivdep
  for (int l = 0; l < L; l++) {
    double f0 = t->f00[l], f = t->f01[l], f1 = t->f11[l];
    double m0_re = 1.0 - x0 * f0, m0_im = -y0 * f0; /* M_00 */
    double m1_re = 1.0 - x1 * f1, m1_im = -y1 * f1; /* M_11 */
    double square = f * f;
    double d_re = m0_re * m1_re - m0_im * m1_im - (x0 * x1 - y0 * y1) * square;
    double d_im = m0_re * m1_im + m0_im * m1_re - (x0 * y1 + y0 * x1) * square;
    double d2 = d_re * d_re + d_im * d_im, inverse = 1.0 / d2;
    double d = sqrt(inverse);
    double k00 = (fabs(m1_re) + fabs(m1_im)) * d, k11 = (fabs(m0_re) + fabs(m0_im)) * d;
    double k01 = size0 * fabs(f) * d, k10 = size1 * fabs(f) * d;
    double g10 = fabs(f) * d;
    double g11 = (fabs(f1) * (fabs(m0_re) + fabs(m0_im)) + size0 * square) * d;
    double a0 = t->a00[l], a = t->a01[l], a1 = t->a11[l];
    /* |K_p1| |F|_pq |K_q0| + |g_1p| (1 + |sigma_p| |F|)_pq |K_q0| */
    double to0 = a0 * k00 + a * k10, to1 = a * k00 + a1 * k10;
    double rounding = k01 * to0 + k11 * to1 + g10 * (k00 + size0 * to0) + g11 * (k10 + size1 * to1);
    /* |G v_a|^2 = (K^dagger S K)_aa with K_00 = m1 / D, K_10 = sigma_1 f / D */
    double u0 = t->s00[l] * (m1_re * m1_re + m1_im * m1_im) +
                t->s11[l] * (x1 * x1 + y1 * y1) * square +
                2 * t->s01[l] * f * (m1_re * x1 + m1_im * y1);
    double u1 = t->s11[l] * (m0_re * m0_re + m0_im * m0_im) +
                t->s00[l] * (x0 * x0 + y0 * y0) * square +
                2 * t->s01[l] * f * (m0_re * x0 + m0_im * y0);
    double norms = sqrt(fabs(u0) * fabs(u1)) * inverse;
    double error = SPECTRUM_SUM_CONSTANT * UNIT_ROUNDOFF * rounding +
                   SPECTRUM_EIGEN_CONSTANT * UNIT_ROUNDOFF * (norm + fabs(energy_ev[l])) * norms;
    transmission[l] = weight * square * inverse;
    log10_transmission[l] = log10_of_normal(transmission[l]);
    relative_error[l] = 2 * error / g10 + 8 * UNIT_ROUNDOFF;
  }
  for (int l = 0; l < L; l++) {
    bool good = t->squares[l] * nearest * nearest <= 1.0 && transmission[l] > 1e-280 &&
                isfinite(relative_error[l]);
    estimate[l] = (mho_estimate){.transmission = transmission[l],
                                 .log10_transmission = log10_transmission[l],
                                 .relative_error = good ? relative_error[l] : INFINITY,
                                 .first_order = good};
  }
}

void mho_spectrum_evaluate_pair(const mho_plan *plan, const double *energy_ev,
                                mho_estimate *estimate)
{
  sums t;
  sum_levels(plan, energy_ev, &t);
  combine(plan, energy_ev, &t, estimate);
}
