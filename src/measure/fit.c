/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "measure/fit.h"

#include "base/processor.h"

#include <math.h>
#include <string.h>

enum { P = MHO_FIT_PARAMETERS, ITERATIONS = 100, LANES = 8 };

/* Of the log likelihood: 0.03 standard errors of independent counts, and
 * points of a trace are far from independent. */
#define GAIN_AT_LEAST 5e-4

static double deviance(int bins, const double *rate, const double *count)
{
  double sum = 0.0;
  for (int i = 0; i < bins; i++)
    sum += rate[i] - (count[i] > 0.0 ? count[i] * log(rate[i]) : 0.0);
  return sum;
}

FOR_EVERY_PROCESSOR
static void normal_equations(int bins, int n, const double *rate, const double *jacobian,
                             const double *count, double h[P][P], double *gradient)
{
  memset(h, 0, sizeof(double[P][P]));
  memset(gradient, 0, (size_t)n * sizeof *gradient);
  double row[P] = {0};
  for (int i = 0; i < bins; i++) {
    memcpy(row, jacobian + (size_t)i * (size_t)n, (size_t)n * sizeof *row);
    double weight = 1.0 / rate[i], slope = 1.0 - count[i] * weight;
    for (int j = 0; j < n; j++) {
      gradient[j] += slope * row[j];
      double part = weight * row[j];
      for (int k = 0; k <= j; k += LANES) /* a little beyond the triangle */
        for (int l = 0; l < LANES; l++) h[j][k + l] += part * row[k + l];
    }
  }
}

/* Solves h x = b for the lower triangle of h, in place; false if h is not
 * positive. */
static bool solve(int n, double h[P][P], double *b)
{
  for (int j = 0; j < n; j++) {
    for (int k = 0; k < j; k++) {
      double part = h[j][k];
      for (int m = 0; m < k; m++) part -= h[j][m] * h[k][m];
      h[j][k] = part / h[k][k];
    }
    double square = h[j][j];
    for (int m = 0; m < j; m++) square -= h[j][m] * h[j][m];
    if (!(square > 0.0)) return false;
    h[j][j] = sqrt(square);
    for (int m = 0; m < j; m++) b[j] -= h[j][m] * b[m];
    b[j] /= h[j][j];
  }
  for (int j = n - 1; j >= 0; j--) {
    for (int m = j + 1; m < n; m++) b[j] -= h[m][j] * b[m];
    b[j] /= h[j][j];
  }
  return true;
}

/* One damped step; a parameter at a bound that the gradient pushes against is
 * held. */
static bool propose(const mho_fit_problem *problem, double h[P][P], const double *gradient,
                    double damping, const double *at, double *next)
{
  int n = problem->parameters;
  double a[P][P], step[P];
  for (int j = 0; j < n; j++) {
    bool held = (at[j] <= problem->lower[j] && gradient[j] > 0.0) ||
                (at[j] >= problem->upper[j] && gradient[j] < 0.0);
    for (int k = 0; k < j; k++) a[j][k] = held ? 0.0 : h[j][k];
    a[j][j] = held ? 1.0 : h[j][j] * (1.0 + damping) + 1e-9;
    step[j] = held ? 0.0 : -gradient[j];
    if (held)
      for (int m = j + 1; m < n; m++) h[m][j] = 0.0;
  }
  if (!solve(n, a, step)) return false;
  for (int j = 0; j < n; j++)
    next[j] = fmin(fmax(at[j] + step[j], problem->lower[j]), problem->upper[j]);
  return true;
}

double mho_fit_counts(const mho_fit_problem *problem, const double *count, double *parameter,
                      double *work)
{
  int n = problem->parameters, bins = problem->bins;
  double *rate = work, *jacobian = work + bins;
  double h[P][P], gradient[P], next[P], damping = 1e-3;
  problem->model(problem->context, parameter, rate, jacobian);
  double best = deviance(bins, rate, count);
  for (int iteration = 0; iteration < ITERATIONS && isfinite(best); iteration++) {
    normal_equations(bins, n, rate, jacobian, count, h, gradient);
    bool moved = false;
    double before = best;
    while (!moved && damping < 1e9) {
      if (propose(problem, h, gradient, damping, parameter, next)) {
        problem->model(problem->context, next, rate, jacobian); /* most steps are taken */
        double there = deviance(bins, rate, count);
        moved = there < best;
        if (moved) best = there;
      }
      damping *= moved ? 0.2 : 8.0;
    }
    if (damping < 1e-9) damping = 1e-9;
    if (!moved) break;
    memcpy(parameter, next, (size_t)n * sizeof *next);
    if (before - best < GAIN_AT_LEAST) break;
  }
  return best;
}
