/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Transmission by sums over the levels of the bare molecule, O(sites) an
 * energy.  With W = [v_1 .. v_m] the vectors of all channels,
 *
 *   F = W^T (E - H)^-1 W = sum_k w_k w_k^T / (E - eps_k),
 *   g = W^T G W = F K,   K = (1 - Sigma F)^-1,   Sigma = diag(shift - i Gamma/2),
 *
 * by the Woodbury identity.  G W = (E - H)^-1 W K, so the norms of its columns
 * come from S = sum_k w_k w_k^T / (E - eps_k)^2.
 *
 * Error of g_ba: a computed spectrum is exact for some H + dH with
 * ||dH|| <= c u ||H|| (Anderson et al., LAPACK Users' Guide, section 4.7),
 * which moves g_ba by at most ||dH|| ||G v_b|| ||G v_a||, and orbitals that are
 * orthogonal only to rounding act like a change of E - H by c u |E|; rounding in F moves
 * it by |K|^T |dF| |K|, rounding in the m x m solve by |g| |dM| |K|.  The
 * method gives up (INFINITY) next to a level, where those sums cancel.
 */
#include <complex.h>
#include <math.h>

#include "solver/spectrum.h"

enum { M = SPECTRUM_CHANNELS_MAX };

typedef struct {
  double scale_ev; /* ||H|| + |E| */
  double f[M][M], f_size[M][M], s[M][M];
  double complex k[M][M]; /* K = (1 - Sigma F)^-1 */
  double complex g[M][M];
} sums;

static bool sum_levels(const mho_plan *plan, double energy_ev, sums *t)
{
  int m = plan->channels;
  t->scale_ev = plan->norm_ev + fabs(energy_ev);
  for (int a = 0; a < m; a++)
    for (int b = 0; b <= a; b++) t->f[a][b] = t->f_size[a][b] = t->s[a][b] = 0;
  for (int k = 0; k < plan->sites; k++) {
    double distance = energy_ev - plan->level_ev[k];
    if (fabs(distance) < SPECTRUM_NEAREST * plan->norm_ev) return false;
    double inverse = 1.0 / distance;
    const double *w = plan->amplitude + (size_t)k * (size_t)m;
    for (int a = 0; a < m; a++)
      for (int b = 0; b <= a; b++) {
        double term = w[a] * w[b] * inverse;
        t->f[a][b] += term;
        t->f_size[a][b] += fabs(term);
        t->s[a][b] += term * inverse;
      }
  }
  for (int a = 0; a < m; a++)
    for (int b = 0; b < a; b++) {
      t->f[b][a] = t->f[a][b];
      t->f_size[b][a] = t->f_size[a][b];
      t->s[b][a] = t->s[a][b];
    }
  return true;
}

/* K by Gauss-Jordan with row pivoting on [1 - Sigma F | 1]; false if singular. */
static bool invert(const mho_plan *plan, sums *t)
{
  int m = plan->channels;
  double complex work[M][2 * M];
  for (int a = 0; a < m; a++) {
    double complex sigma = plan->shift_ev[a] - 0.5 * I * plan->coupling_ev[a];
    for (int b = 0; b < m; b++) {
      work[a][b] = (a == b) - sigma * t->f[a][b];
      work[a][m + b] = a == b;
    }
  }
  for (int k = 0; k < m; k++) {
    int pivot = k;
    for (int i = k + 1; i < m; i++)
      if (cabs(work[i][k]) > cabs(work[pivot][k])) pivot = i;
    if (!(cabs(work[pivot][k]) > 0)) return false;
    for (int j = 0; j < 2 * m; j++) {
      double complex swap = work[k][j];
      work[k][j] = work[pivot][j];
      work[pivot][j] = swap;
    }
    double complex scale = 1.0 / work[k][k];
    for (int j = k; j < 2 * m; j++) work[k][j] *= scale;
    for (int i = 0; i < m; i++) {
      if (i == k) continue;
      double complex factor = work[i][k];
      for (int j = k; j < 2 * m; j++) work[i][j] -= factor * work[k][j];
    }
  }
  for (int a = 0; a < m; a++)
    for (int b = 0; b < m; b++) t->k[a][b] = work[a][m + b];
  return true;
}

/* ||G v_a||^2 = (K^dagger S K)_aa. */
static double column_norm(const sums *t, int m, int a)
{
  double complex sum = 0;
  for (int p = 0; p < m; p++)
    for (int q = 0; q < m; q++) sum += conj(t->k[p][a]) * t->s[p][q] * t->k[q][a];
  return sqrt(fmax(creal(sum), 0.0));
}

/* Bound on the error of g_ba; sigma_size[p] = |Sigma_p|. */
static double element_error(const mho_plan *plan, const sums *t,
                            const double *sigma_size, const double *norm, int a, int b)
{
  int m = plan->channels;
  double rounding = 0;
  for (int p = 0; p < m; p++)
    for (int q = 0; q < m; q++) {
      double left = cabs(t->k[p][b]) * t->f_size[p][q];
      double solve = cabs(t->g[b][p]) * ((p == q) + sigma_size[p] * t->f_size[p][q]);
      rounding += (left + solve) * cabs(t->k[q][a]);
    }
  return SPECTRUM_SUM_CONSTANT * UNIT_ROUNDOFF * rounding +
         SPECTRUM_EIGEN_CONSTANT * UNIT_ROUNDOFF * t->scale_ev * norm[a] * norm[b];
}

void mho_spectrum_evaluate(const mho_plan *plan, double energy_ev,
                           mho_estimate *estimate)
{
  *estimate = (mho_estimate){.relative_error = INFINITY};
  sums t;
  int m = plan->channels;
  if (m > M || !sum_levels(plan, energy_ev, &t) || !invert(plan, &t)) return;
  double sigma_size[M], norm[M];
  for (int a = 0; a < m; a++) {
    sigma_size[a] = hypot(plan->shift_ev[a], 0.5 * plan->coupling_ev[a]);
    norm[a] = column_norm(&t, m, a);
    for (int b = 0; b < m; b++) {
      t.g[a][b] = 0;
      for (int p = 0; p < m; p++) t.g[a][b] += t.f[a][p] * t.k[p][b];
    }
  }
  double transmission = 0, error = 0;
  for (int a = 0; a < plan->left; a++)
    for (int b = plan->left; b < m; b++) {
      double weight = plan->coupling_ev[a] * plan->coupling_ev[b];
      double size = cabs(t.g[b][a]);
      transmission += weight * size * size;
      error += 2 * weight * size * element_error(plan, &t, sigma_size, norm, a, b);
    }
  if (!(transmission > 1e-280)) return;
  estimate->transmission = transmission;
  estimate->log10_transmission = log10(transmission);
  estimate->relative_error = error / transmission + 8 * UNIT_ROUNDOFF;
  estimate->first_order = true;
}
