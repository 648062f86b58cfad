/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * How far T follows cos^2 of the angle, and averages over a torsion.
 */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include <mho/constants.h>

#include "analysis/rotor.h"
#include "solver/plan.h"

enum { LAW_LAST_DEG = 80, FIT_LAST_DEG = 85, POINTS_MIN = 8, EVALUATIONS_MAX = 40000, SERIES = 2048 };

#define KJ_PER_MOL_PER_EV (MHO_ELEMENTARY_CHARGE_C * MHO_AVOGADRO_PER_MOL / 1000)
#define LAW_DECADES 0.021189299069938095  /* log10(1.05) */
#define POLE_REACH 0.25                    /* of |t| */
#define MOTIONAL_TOLERANCE 1e-8
#define FROZEN_TOLERANCE 1e-6
#define LN_10 2.302585092994045684
#define RADIAN (3.14159265358979323846 / 180)

static mho_status fail_memory(mho_error *error)
{
  return mho_fail(error, MHO_ERR_MEMORY, "analysis", NULL, "out of memory");
}

/* Straight line through (x, y): slope and root mean square of the rest. */
static void fit_line(size_t count, const double *x, const double *y, mho_twist_law *law)
{
  double mx = 0, my = 0, xx = 0, xy = 0, rest = 0;
  for (size_t i = 0; i < count; i++) {
    mx += x[i] / (double)count;
    my += y[i] / (double)count;
  }
  for (size_t i = 0; i < count; i++) {
    xx += (x[i] - mx) * (x[i] - mx);
    xy += (x[i] - mx) * (y[i] - my);
  }
  law->exponent = xy / xx;
  for (size_t i = 0; i < count; i++) {
    double r = y[i] - my - law->exponent * (x[i] - mx);
    rest += r * r / (double)count;
  }
  law->residual_decades = sqrt(rest);
  law->has_fit = true;
}

static mho_status near_pole(const mho_rotor *rotor, double energy_ev, bool *near, mho_error *error)
{
  double reach = POLE_REACH * fabs(rotor->hopping_ev);
  *near = false;
  for (int k = 0; k < ROTOR_CHECKS; k++) {
    mho_pole *pole;
    size_t count;
    mho_status status = mho_plan_resonances(rotor->check[k], energy_ev - reach, energy_ev + reach,
                                            &pole, &count, error);
    for (size_t i = 0; status == MHO_OK && i < count; i++)
      *near |= pole[i].width_ev > 0 && fabs(pole[i].energy_ev - energy_ev) < reach;
    free(pole);
    if (status != MHO_OK) return status;
  }
  return MHO_OK;
}

mho_status mho_twist_fit_law(const mho_rotor *rotor, double energy_ev, mho_twist_law *law,
                             mho_error *error)
{
  double angle[FIT_LAST_DEG + 2], x[FIT_LAST_DEG + 2], y[FIT_LAST_DEG + 2];
  mho_point point[FIT_LAST_DEG + 2];
  size_t count = 0;
  *law = (mho_twist_law){.holds_to_deg = 0};
  for (int i = 0; i <= FIT_LAST_DEG; i++) angle[i] = i;
  angle[FIT_LAST_DEG + 1] = 90;
  mho_status status =
      mho_rotor_sweep(rotor, energy_ev, FIT_LAST_DEG + 2, angle, point, error);
  if (status != MHO_OK) return status;
  bool holds = !point[0].node;
  for (int i = 0; i <= FIT_LAST_DEG; i++) {
    if (point[i].node) continue;
    x[count] = 2 * log10(mho_cos_deg(i));
    y[count++] = point[i].log10_transmission;
    if (i > LAW_LAST_DEG || point[0].node) continue;
    double miss = fabs(y[count - 1] - point[0].log10_transmission - x[count - 1]);
    law->largest_decades = fmax(law->largest_decades, miss);
    holds &= miss <= LAW_DECADES;
    if (holds) law->holds_to_deg = i;
  }
  if (count < 3) return MHO_OK;
  fit_line(count, x, y, law);
  if (!point[0].node && law->largest_decades <= LAW_DECADES) return MHO_OK;
  const mho_point *last = &point[FIT_LAST_DEG + 1];
  bool near;
  status = near_pole(rotor, energy_ev, &near, error);
  law->reason = !last->node        ? MHO_TWIST_OTHER_PATH
                : rotor->bonds > 1 ? MHO_TWIST_SEVERAL_BONDS
                : near             ? MHO_TWIST_NEAR_POLE
                                   : MHO_TWIST_STRONG_COUPLING;
  return status;
}

mho_status mho_twist_find_limits(const mho_rotor *rotor, size_t count, const double *fraction,
                                 double *limit_deg, mho_error *error)
{
  double angle[91], value[91];
  for (int i = 0; i <= 90; i++) angle[i] = i;
  mho_status status = mho_rotor_conductance(rotor, 91, angle, value, error);
  for (size_t k = 0; status == MHO_OK && k < count; k++) {
    int last = 0;
    while (last < 90 && value[last + 1] >= value[0] + log10(fraction[k])) last++;
    limit_deg[k] = isfinite(value[0]) ? last : 0;
  }
  return status;
}

/* exp(-V/kT), with the lowest V on `count` midpoints of 0 to 180 degrees as zero. */
static void fill_weights(const mho_torsion *torsion, double kt_kj, size_t count, double *weight)
{
  double low = INFINITY;
  for (size_t i = 0; i < count; i++) {
    weight[i] = mho_torsion_energy(torsion, ((double)i + 0.5) * 180.0 / (double)count);
    low = fmin(low, weight[i]);
  }
  for (size_t i = 0; i < count; i++) weight[i] = exp((low - weight[i]) / kt_kj);
}

/* Means of cos^2 and of log10 cos^2 over a torsion, from its Fourier series. */
static mho_status average_cosine(const mho_torsion *torsion, double kt_kj, double *cos2,
                                 double *log10_cos2, mho_error *error)
{
  double *weight = malloc(SERIES * sizeof *weight), total = 0, ln = -2 * log(2.0);
  if (!weight) return fail_memory(error);
  fill_weights(torsion, kt_kj, SERIES, weight);
  for (size_t i = 0; i < SERIES; i++) total += weight[i];
  for (int k = 1; k < SERIES / 2; k++) {
    double sum = 0;
    for (size_t i = 0; i < SERIES; i++)
      sum += weight[i] * cos(2 * k * ((double)i + 0.5) * 180.0 / SERIES * RADIAN);
    sum /= total;
    if (k == 1) *cos2 = 0.5 * (1 + sum);
    ln += (k % 2 ? 2 : -2) * sum / k;
  }
  *log10_cos2 = ln / LN_10;
  free(weight);
  return MHO_OK;
}

typedef struct {
  const mho_rotor *rotor;
  double kt_kj;
  const mho_torsion *torsion;
  int order[MHO_TWIST_AVERAGE_BONDS_MAX]; /* G ~ cos^(2 order) towards 90 degrees */
  bool dead;                              /* G was zero at some point */
} averager;

/* Means on `points` angles a bond: of G / 10^scale, and of the smooth part of
 * log10 G. */
static mho_status average_on(averager *a, size_t points, double scale, double *mean,
                             double *smooth, mho_error *error)
{
  int bonds = a->rotor->bonds;
  bool half = a->rotor->bridge; /* G(180 - theta) = G(theta) */
  size_t full = half ? 2 * points : points, total = 1;
  double *weight = malloc((size_t)bonds * full * sizeof *weight), sum = 0;
  if (!weight) return fail_memory(error);
  for (int k = 0; k < bonds; k++) {
    double *w = weight + (size_t)k * full;
    fill_weights(&a->torsion[k], a->kt_kj, full, w);
    for (size_t i = 0; half && i < points; i++) w[i] += w[full - 1 - i];
    total *= points;
  }
  mho_status status = MHO_OK;
  *mean = *smooth = 0;
  for (size_t index = 0; status == MHO_OK && index < total; index++) {
    double angle[MHO_TWIST_AVERAGE_BONDS_MAX], w = 1, singular = 0, value;
    size_t rest = index;
    for (int k = 0; k < bonds; k++, rest /= points) {
      size_t i = rest % points;
      angle[k] = ((double)i + 0.5) * 180.0 / (double)full;
      w *= weight[(size_t)k * full + i];
      singular += a->order[k] * 2 * log10(fabs(mho_cos_deg(angle[k])));
    }
    status = mho_rotor_log10(a->rotor, angle, &value, error);
    sum += w;
    if (!isfinite(value)) {
      a->dead = true;
      continue;
    }
    *mean += w * pow(10, value - scale);
    *smooth += w * (value - singular);
  }
  free(weight);
  *mean /= sum;
  *smooth /= sum;
  return status;
}

/* How G dies as bond k goes to 90 degrees, the others at 30. */
static mho_status find_order(averager *a, int k, mho_error *error)
{
  static const double towards[] = {86.0, 89.0, 90.0};
  double angle[MHO_TWIST_AVERAGE_BONDS_MAX] = {30, 30, 30}, value[3];
  for (int i = 0; i < 3; i++) {
    angle[k] = towards[i];
    mho_status status = mho_rotor_log10(a->rotor, angle, &value[i], error);
    if (status != MHO_OK) return status;
  }
  a->order[k] = 0;
  if (isfinite(value[2]) || !isfinite(value[1]) || !isfinite(value[0])) return MHO_OK;
  double slope = (value[1] - value[0]) /
                 (2 * log10(mho_cos_deg(towards[1]) / mho_cos_deg(towards[0])));
  a->order[k] = (int)lround(slope);
  return MHO_OK;
}

static mho_status converge(averager *a, double log10_singular, mho_twist_average *average,
                           mho_error *error)
{
  double scale = isfinite(average->planar_log10_g0) ? average->planar_log10_g0 : 0;
  double mean = 0, smooth = 0, last_mean = NAN, last_smooth = NAN;
  bool half = a->rotor->bridge;
  for (size_t points = half ? POINTS_MIN : 2 * POINTS_MIN;; points *= 2) {
    double work = pow((double)points, a->rotor->bonds);
    if (work > EVALUATIONS_MAX) break;
    mho_status status = average_on(a, points, scale, &mean, &smooth, error);
    if (status != MHO_OK) return status;
    average->converged = fabs(mean - last_mean) <= MOTIONAL_TOLERANCE * mean &&
                         (a->dead || fabs(smooth - last_smooth) <= FROZEN_TOLERANCE);
    last_mean = mean;
    last_smooth = smooth;
    if (average->converged || mean == 0) break;
  }
  average->motional_log10_g0 = mean > 0 ? log10(mean) + scale : -INFINITY;
  average->has_frozen = !a->dead;
  average->frozen_log10_g0 = a->dead ? 0 : smooth + log10_singular;
  average->converged |= mean == 0;
  return MHO_OK;
}

mho_status mho_twist_average_compute(const mho_rotor *rotor, const mho_torsion *torsion,
                                     mho_twist_average *average, mho_error *error)
{
  double kelvin = rotor->molecule->temperature_k, singular = 0, flat[MHO_TWIST_BONDS_MAX] = {0};
  *average = (mho_twist_average){.temperature_k = kelvin, .mean_cos2 = 1};
  if (rotor->bonds > MHO_TWIST_AVERAGE_BONDS_MAX)
    return mho_fail(error, MHO_ERR_SIZE, "analysis", "torsion",
                    "torsion: %d bonds are to be averaged; at most %d are", rotor->bonds,
                    MHO_TWIST_AVERAGE_BONDS_MAX);
  if (!(kelvin > 0))
    return mho_fail(error, MHO_ERR_RANGE, "analysis", "temperature",
                    "temperature: a thermal average needs a temperature above 0 K");
  averager a = {.rotor = rotor,
                .kt_kj = MHO_BOLTZMANN_EV_PER_K * kelvin * KJ_PER_MOL_PER_EV,
                .torsion = torsion};
  mho_status status = mho_rotor_log10(rotor, flat, &average->planar_log10_g0, error);
  for (int k = 0; status == MHO_OK && k < rotor->bonds; k++) {
    double cos2 = 1, log10_cos2 = 0;
    status = average_cosine(&torsion[k], a.kt_kj, &cos2, &log10_cos2, error);
    if (status == MHO_OK) status = find_order(&a, k, error);
    average->mean_cos2 *= cos2;
    singular += a.order[k] * log10_cos2;
  }
  return status == MHO_OK ? converge(&a, singular, average, error) : status;
}
