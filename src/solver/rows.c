/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * H = Q T Q^T with T tridiagonal by Householder's reflections, then T = P eps P^T
 * by the implicit QL method with Wilkinson's shift; of the orbitals QP only the
 * products with two vectors are carried along, as Golub and Welsch do for one
 * (Math. Comp. 23, 221 (1969)), so that O(sites^2) is left of the costlier half
 * of a diagonalisation.  The reflections are Martin, Reinsch and Wilkinson's
 * (Numer. Math. 11, 181 (1968)), the rotations Dubrulle's (12, 377 (1968)).
 */
#include "solver/rows.h"

#include <float.h>
#include <math.h>
#include <string.h>

#include "base/processor.h"

enum { S = ROWS_SITES_MAX, SWEEPS_MAX = 60 };

/* Off-diagonal elements below this part of the norm count as zero; smaller ones than
 * the last digit of a level may never shrink. */
#define NEGLIGIBLE DBL_EPSILON

/* A square below it counts as zero; so that squares and their ratios neither
 * vanish nor overflow, the largest element of H has to be within these bounds. */
#define VANISHING 1e-200
#define LARGEST_MIN 1e-30
#define LARGEST_MAX 1e30

/* Reflects site k's neighbours below it onto site k + 1; v is normalised to
 * v^T v = 2 and starts at k + 1.  False: nothing to do. */
INLINED bool reflector(const double *column, int k, int sites, int stride, double *v,
                       double *beside)
{
  double square = 0;
  for (int i = k + 2; i < sites; i++) square += column[i] * column[i];
  *beside = column[k + 1];
  if (square == 0) return false;
  double size = sqrt(column[k + 1] * column[k + 1] + square);
  *beside = column[k + 1] > 0 ? -size : size;
  double first = column[k + 1] - *beside;
  double scale = sqrt(2 / (first * first + square));
  for (int i = 0; i < stride; i++) v[i] = i > k + 1 && i < sites ? scale * column[i] : 0;
  v[k + 1] = scale * first;
  return true;
}

/* H <- (1 - v v^T) H (1 - v v^T) on the sites from `first` on; with p = H v and
 * w = p - (v^T p / 2) v that is H - v w^T - w v^T. */
INLINED void reflect(double *h, double *row, int first, int sites, int stride, const double *v)
{
  double p[S] = {0};
  int start = first & ~7;
  for (int i = first; i < sites; i++)
    for (int j = start; j < stride; j++) p[j] += v[i] * h[i * stride + j];
  double half = 0;
  for (int i = first; i < sites; i++) half += 0.5 * v[i] * p[i];
  for (int j = start; j < stride; j++) p[j] -= half * v[j];
  for (int i = first; i < sites; i++)
    for (int j = start; j < stride; j++) h[i * stride + j] -= v[i] * p[j] + p[i] * v[j];
  for (int r = 0; r < 2; r++) {
    double overlap = 0;
    for (int i = first; i < sites; i++) overlap += row[r * stride + i] * v[i];
    for (int j = start; j < stride; j++) row[r * stride + j] -= overlap * v[j];
  }
}

FOR_EVERY_PROCESSOR
static void tridiagonalise(int sites, int stride, double *h, double *row, double *diagonal,
                           double *beside)
{
  double v[S];
  for (int k = 0; k < sites; k++) {
    beside[k] = 0;
    if (k + 1 < sites && reflector(h + k * stride, k, sites, stride, v, &beside[k]))
      reflect(h, row, k + 1, sites, stride, v);
    diagonal[k] = h[k * stride + k];
  }
}

/* Rotations by their squares, with the signs of the cosines; sines are positive. */
typedef struct {
  double cosine2[S], sine2[S], sign[S];
} turns;

/* One QL step with a shift on the unreduced block first .. last, rational in the
 * squares of the off-diagonals e > 0: where p and c are those of the rotation
 * before, gamma = p c, the next has c^2 : s^2 = p^2 : e^2.  True if e[first]
 * comes out negative. */
INLINED bool step(int first, int last, double *d, double *e2, turns *turn)
{
  double half = 0.5 * (d[first + 1] - d[first]), root = sqrt(half * half + e2[first]);
  double shift = d[first] - e2[first] / (half < 0 ? half - root : half + root);
  double c = 1, s = 0, gamma = d[last] - shift, p = gamma * gamma;
  double sign = copysign(1, gamma), sign_before = 1;
  for (int i = last - 1; i >= first; i--) {
    double e = e2[i], r = p + e, gamma_before = gamma, c_before = c, sign_now = sign;
    e2[i + 1] = s * r;
    c = p / r;
    s = e / r;
    turn->cosine2[i] = c;
    turn->sine2[i] = s;
    turn->sign[i] = sign;
    gamma = c * (d[i] - shift) - s * gamma_before;
    d[i + 1] = gamma_before + (d[i] - gamma);
    sign *= copysign(1, gamma);
    if (p > VANISHING) {
      p = gamma * gamma * (r / p);
    } else {
      p = c_before * e;
      sign = -sign_before;
    }
    sign_before = sign_now;
  }
  d[first] = shift + gamma;
  e2[first] = s * p;
  return sign < 0;
}

/* Applies the rotations of a step to both rows. */
INLINED void rotate(int first, int last, const turns *turn, double (*amplitude)[2])
{
  double sine[S], cosine[S];
  for (int i = first & ~7; i < ((last + 7) & ~7); i++) {
    sine[i] = sqrt(turn->sine2[i]);
    cosine[i] = turn->sign[i] * sqrt(turn->cosine2[i]);
  }
  double a = amplitude[last][0], b = amplitude[last][1];
  for (int i = last - 1; i >= first; i--) {
    double s = sine[i], c = cosine[i], x = amplitude[i][0], y = amplitude[i][1];
    amplitude[i + 1][0] = s * x + c * a;
    amplitude[i + 1][1] = s * y + c * b;
    a = c * x - s * a;
    b = c * y - s * b;
  }
  amplitude[first][0] = a;
  amplitude[first][1] = b;
}

INLINED void change_sign(double *amplitude)
{
  amplitude[0] = -amplitude[0];
  amplitude[1] = -amplitude[1];
}

/* Squares of the off-diagonals, made positive first; the largest sum over a row. */
INLINED double square(int sites, const double *d, double *e, double (*amplitude)[2])
{
  double norm = 0, sign = 1, before = 0;
  for (int i = 0; i < sites; i++) {
    double size = before + fabs(d[i]) + fabs(e[i]);
    norm = size > norm ? size : norm;
    before = fabs(e[i]);
    if (sign < 0) change_sign(amplitude[i]);
    if (e[i] < 0) sign = -sign;
    e[i] *= e[i];
  }
  return norm;
}

FOR_EVERY_PROCESSOR
static bool diagonalise(int sites, double *d, double *e, double (*amplitude)[2])
{
  turns turn = {0};
  double small = NEGLIGIBLE * square(sites, d, e, amplitude);
  for (int first = 0; first < sites; first++)
    for (int sweeps = 0;; sweeps++) {
      int last = first;
      while (e[last] > small * small) last++;
      if (last == first) break;
      if (sweeps == SWEEPS_MAX) return false;
      bool negative = step(first, last, d, e, &turn);
      rotate(first, last, &turn, amplitude);
      if (negative) change_sign(amplitude[first]);
    }
  return true;
}

static void sort(int sites, double *level, double (*amplitude)[2])
{
  for (int i = 1; i < sites; i++) {
    double key = level[i], a = amplitude[i][0], b = amplitude[i][1];
    int k = i;
    for (; k > 0 && level[k - 1] > key; k--) {
      level[k] = level[k - 1];
      memcpy(amplitude[k], amplitude[k - 1], sizeof *amplitude);
    }
    level[k] = key;
    amplitude[k][0] = a;
    amplitude[k][1] = b;
  }
}

/* H and both vectors in rows that end in zeros, so that they are whole vectors;
 * the largest element of H. */
static double fill(const mho_plan *plan, int stride, double *h, double *row)
{
  double largest = 0;
  for (size_t e = 0; e < plan->entries; e++) {
    int i = plan->entry[e].i, j = plan->entry[e].j;
    double value = h[i * stride + j] += plan->entry[e].value_ev;
    h[j * stride + i] = value;
    largest = fmax(largest, fabs(value));
  }
  for (int side = 0; side < 2; side++)
    memcpy(row + side * stride, plan->vector + side * plan->sites,
           (size_t)plan->sites * sizeof *row);
  return largest;
}

bool mho_rows_diagonalise(const mho_plan *plan, double *level_ev, double (*amplitude)[2])
{
  int n = plan->sites, stride = (n + 7) & ~7;
  double h[S * S], row[2 * S] = {0}, beside[S];
  memset(h, 0, (size_t)(n * stride) * sizeof *h);
  double largest = fill(plan, stride, h, row);
  if (!(largest >= LARGEST_MIN && largest <= LARGEST_MAX)) return false;
  tridiagonalise(n, stride, h, row, level_ev, beside);
  for (int i = 0; i < n; i++)
    for (int k = 0; k < 2; k++) amplitude[i][k] = row[k * stride + i];
  if (!diagonalise(n, level_ev, beside, amplitude)) return false;
  sort(n, level_ev, amplitude);
  return true;
}
