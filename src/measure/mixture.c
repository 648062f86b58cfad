/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "measure/mixture.h"

#include <math.h>
#include <stddef.h>

#define SQRT1_2 0.70710678118654752440
#define SQRT_1_2PI 0.39894228040143267794

enum { G = MHO_GAUSSIAN_PARAMETERS };

/* A little everywhere, so that no count is impossible. */
#define RATE_FLOOR 1e-6

/* 0 as exp() has it, without the handling of its underflow. */
static double normal(double z)
{
  return z * z < 1492.0 ? SQRT_1_2PI * exp(-0.5 * z * z) : 0.0;
}

static double upper_half(double z)
{
  return z < 39.6 ? 0.5 * erfc(z * SQRT1_2) : 0.0;
}

static void add_gaussian(const mho_mixture *m, const double *p, int column, int n,
                         double *rate, double *jacobian)
{
  double amplitude = exp(p[0]), sigma = exp(p[2]);
  double z = (m->edge[0] - p[1]) / sigma, cdf = 0.5 * erf(z * SQRT1_2);
  double pdf = jacobian ? normal(z) : 0.0;
  for (int i = 0; i < m->bins; i++) {
    double z1 = (m->edge[i + 1] - p[1]) / sigma, cdf1 = 0.5 * erf(z1 * SQRT1_2);
    double part = amplitude * (cdf1 - cdf);
    rate[i] += part;
    if (jacobian) {
      double pdf1 = normal(z1), *row = jacobian + i * n + column;
      row[0] = part;
      row[1] = -amplitude * (pdf1 - pdf) / sigma;
      row[2] = -amplitude * (z1 * pdf1 - z * pdf);
      pdf = pdf1;
    }
    z = z1;
    cdf = cdf1;
  }
}

static void add_tail(const mho_mixture *m, const double *p, int column, int n, double *rate,
                     double *jacobian)
{
  double sigma = exp(p[2]), edge = p[1] - p[4], height = exp(p[3]);
  for (int i = 0; i < m->bins; i++) {
    double z = (0.5 * (m->edge[i + 1] + m->edge[i]) - edge) / sigma;
    double scale = height * (m->edge[i + 1] - m->edge[i]);
    double part = scale * upper_half(z);
    rate[i] += part;
    if (!jacobian) continue;
    double slope = scale * normal(z), *row = jacobian + i * n + column;
    row[1] += slope / sigma;
    row[2] += slope * z;
    row[3] = part;
    row[4] = -slope / sigma;
  }
}

static void add_component(const mho_mixture *m, const double *p, int column, int n,
                          double *rate, double *jacobian)
{
  add_gaussian(m, p, column, n, rate, jacobian);
  add_tail(m, p, column, n, rate, jacobian);
}

static void add_plateau(const mho_mixture *m, const double *p, int column, int n,
                        double *rate, double *jacobian)
{
  double left = p[1], right = p[1] + p[2], sl = exp(p[3]), sr = exp(p[4]);
  double centre = 0.5 * (m->edge[0] + m->edge[m->bins]);
  for (int i = 0; i < m->bins; i++) {
    double width = m->edge[i + 1] - m->edge[i], x = 0.5 * (m->edge[i + 1] + m->edge[i]);
    double zl = (x - left) / sl, zr = (x - right) / sr;
    double scale = width * exp(p[0] + p[5] * (x - centre));
    double part = scale * 0.5 * (erf(zl * SQRT1_2) - erf(zr * SQRT1_2));
    if (part < 0.0) part = 0.0; /* soft edges that cross */
    rate[i] += part;
    if (!jacobian) continue;
    double nl = normal(zl) * scale, nr = normal(zr) * scale, *row = jacobian + i * n + column;
    row[0] = part;
    row[1] = nr / sr - nl / sl;
    row[2] = nr / sr;
    row[3] = -nl * zl;
    row[4] = nr * zr;
    row[5] = part * (x - centre);
  }
}

static void mixture_rate(const void *context, const double *parameter, double *rate,
                         double *jacobian)
{
  const mho_mixture *m = context;
  int n = MHO_MIXTURE_PARAMETERS(m->gaussians);
  for (int i = 0; i < m->bins; i++) rate[i] = RATE_FLOOR;
  for (int k = 0; k < m->gaussians; k++)
    add_component(m, parameter + G * k, G * k, n, rate, jacobian);
  int last = G * m->gaussians;
  add_plateau(m, parameter + last, last, n, rate, jacobian);
}

mho_fit_problem mho_mixture_problem(const mho_mixture *mixture)
{
  double low = mixture->edge[0], high = mixture->edge[mixture->bins];
  double bin = mixture->edge[1] - low;
  mho_fit_problem problem = {mixture_rate, mixture, mixture->bins,
                             MHO_MIXTURE_PARAMETERS(mixture->gaussians), {0}, {0}};
  int n = 0;
  for (int k = 0; k < mixture->gaussians; k++) {
    const double lower[G] = {-20.0, low, log(0.5 * bin), -20.0, 0.0};
    const double upper[G] = {40.0, high, log(0.6), 40.0, 1.5};
    for (int j = 0; j < G; j++, n++) problem.lower[n] = lower[j], problem.upper[n] = upper[j];
  }
  double soft = log(0.02), softest = log(0.6);
  double least = fmax(1.0, 0.5 * (high - low));
  const double lower[6] = {-20.0, low - 1.0, least, soft, soft, -2.0};
  const double upper[6] = {40.0, low + 0.5, high - low + 2.0, softest, softest, 2.0};
  for (int j = 0; j < 6; j++, n++) problem.lower[n] = lower[j], problem.upper[n] = upper[j];
  return problem;
}

void mho_mixture_flat(const mho_mixture *mixture, double total, double *parameter)
{
  double low = mixture->edge[0], width = mixture->edge[mixture->bins] - low;
  parameter[0] = log(fmax(total, 1e-3) / width);
  parameter[1] = low;
  parameter[2] = fmax(width, 1.0);
  parameter[3] = parameter[4] = log(0.1);
  parameter[5] = 0.0;
}

double mho_mixture_density(const mho_mixture *mixture, const double *parameter, double x)
{
  double edge[2] = {x - 5e-4, x + 5e-4}, rate = 0.0, sum;
  mho_mixture narrow = {1, mixture->gaussians, edge};
  for (int k = 0; k < mixture->gaussians; k++)
    add_component(&narrow, parameter + G * k, 0, 0, &rate, NULL);
  sum = rate / 1e-3;
  /* The tilt counts from the middle of the whole window. */
  const double *p = parameter + G * mixture->gaussians;
  double centre = 0.5 * (mixture->edge[0] + mixture->edge[mixture->bins]);
  double part = erf((x - p[1]) / exp(p[3]) * SQRT1_2) - erf((x - p[1] - p[2]) / exp(p[4]) * SQRT1_2);
  return sum + fmax(0.0, 0.5 * part * exp(p[0] + p[5] * (x - centre)));
}

double mho_mixture_prominence(const mho_mixture *mixture, const double *parameter, int k)
{
  enum { STEPS = 25 };
  double mu = parameter[G * k + 1], reach = 2.5 * exp(parameter[G * k + 2]);
  double from = fmax(mu - reach, mixture->edge[0]);
  double to = fmin(mu + reach, mixture->edge[mixture->bins]);
  double density[2 * STEPS + 1], highest = 0.0;
  int top = 0;
  for (int i = 0; i <= 2 * STEPS; i++) {
    density[i] = mho_mixture_density(mixture, parameter, from + (to - from) * i / (2.0 * STEPS));
    if (density[i] > highest) highest = density[i], top = i;
  }
  if (top == 0 || top == 2 * STEPS) return 0.0;
  double left = highest, right = highest;
  for (int i = 0; i <= 2 * STEPS; i++) {
    double *flank = i < top ? &left : &right;
    *flank = fmin(*flank, density[i]);
  }
  return highest / fmax(fmax(left, right), 1e-6 * highest) - 1.0;
}
