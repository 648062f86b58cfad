/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "analysis/rotor.h"

#include <complex.h>
#include <float.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include <mho/constants.h>

#include "analysis/perturb.h"
#include "analysis/thermal.h"
#include "base/lapack.h"
#include "base/processor.h"

/* Where the form is held against the plan, and to what. */
static const double check_deg[ROTOR_CHECKS] = {0.0, 41.0, 79.0};
#define CHECK_TOLERANCE 1e-9

/* Sums that cancel to less than this part of their terms go to the plan. */
#define CANCELLATION 1e-5

static mho_status fail_memory(mho_error *error)
{
  return mho_fail(error, MHO_ERR_MEMORY, "analysis", NULL, "out of memory");
}

static mho_status build(const mho_rotor *rotor, const double *angle_deg, mho_junction *junction,
                        mho_error *error)
{
  mho_molecule turned;
  mho_status status = mho_copy_numbers(rotor->molecule, &turned, error);
  turned.fermi = (mho_fermi){.kind = MHO_FERMI_ENERGY, .offset_ev = rotor->fermi_ev};
  for (int k = 0; status == MHO_OK && k < rotor->bonds; k++)
    turned.bond[rotor->bond[k]].twist_deg = angle_deg[k];
  if (status == MHO_OK) status = mho_junction_build(&turned, junction, error);
  free(turned.site);
  free(turned.bond);
  return status;
}

mho_status mho_rotor_turn(const mho_rotor *rotor, const double *angle_deg, mho_plan **plan,
                          mho_error *error)
{
  mho_junction junction = {0};
  *plan = NULL;
  mho_status status = build(rotor, angle_deg, &junction, error);
  if (status == MHO_OK) status = mho_plan_create(&junction, plan, error);
  mho_junction_clear(&junction);
  return status;
}

static mho_status turn_all(const mho_rotor *rotor, double angle_deg, mho_plan **plan,
                           mho_error *error)
{
  double angle[MHO_TWIST_BONDS_MAX];
  for (int k = 0; k < rotor->bonds; k++) angle[k] = angle_deg;
  return mho_rotor_turn(rotor, angle, plan, error);
}

mho_status mho_rotor_log10(const mho_rotor *rotor, const double *angle_deg, double *log10_g0,
                           mho_error *error)
{
  mho_plan *plan;
  mho_status status = mho_rotor_turn(rotor, angle_deg, &plan, error);
  if (status == MHO_OK)
    status = mho_thermal_log10(plan, NULL, &rotor->fermi_ev, 1,
                               MHO_BOLTZMANN_EV_PER_K * rotor->molecule->temperature_k, log10_g0,
                               error);
  mho_plan_free(plan);
  return status;
}

/* Does no other path join the ends of the bond? */
static mho_status find_bridge(const mho_molecule *m, int bond, bool *bridge)
{
  bool *reached = calloc((size_t)m->site_count, sizeof *reached);
  if (!reached) return MHO_ERR_MEMORY;
  reached[m->bond[bond].site[0]] = true;
  for (bool grown = true; grown;) {
    grown = false;
    for (int b = 0; b < m->bond_count; b++) {
      int i = m->bond[b].site[0], j = m->bond[b].site[1];
      if (b == bond || reached[i] == reached[j]) continue;
      reached[i] = reached[j] = grown = true;
    }
  }
  *bridge = !reached[m->bond[bond].site[1]];
  free(reached);
  return MHO_OK;
}

static mho_status prepare(mho_rotor *rotor, mho_error *error)
{
  const mho_molecule *m = rotor->molecule;
  double open[MHO_TWIST_BONDS_MAX];
  rotor->bridge = true;
  for (int k = 0; k < rotor->bonds; k++) {
    bool bridge;
    if (find_bridge(m, rotor->bond[k], &bridge) != MHO_OK) return fail_memory(error);
    rotor->bridge &= bridge;
    open[k] = 90.0;
  }
  mho_molecule flat = *m;
  mho_bond first = m->bond[rotor->bond[0]];
  first.twist_deg = 0;
  flat.bond = &first;
  rotor->hopping_ev = mho_molecule_hopping_ev(&flat, 0);
  mho_status status = build(rotor, open, &rotor->open, error);
  for (int k = 0; status == MHO_OK && k < ROTOR_CHECKS; k++)
    status = turn_all(rotor, check_deg[k], &rotor->check[k], error);
  return status;
}

mho_status mho_rotor_create(const mho_molecule *molecule, const mho_junction *junction,
                            const int *bond, int bonds, mho_rotor **result, mho_error *error)
{
  *result = NULL;
  if (bonds < 1 || bonds > MHO_TWIST_BONDS_MAX)
    return mho_fail(error, MHO_ERR_SIZE, "analysis", "bond",
                    "bond: %d bonds are to turn; allowed are 1 to %d", bonds,
                    MHO_TWIST_BONDS_MAX);
  for (int k = 0; k < bonds; k++)
    if (bond[k] < 0 || bond[k] >= molecule->bond_count)
      return mho_fail(error, MHO_ERR_SIZE, "analysis", "bond", "bond: there is no bond %d",
                      bond[k]);
  mho_status status = mho_junction_require_contacts(junction, molecule, error);
  if (status != MHO_OK) return status;
  mho_rotor *rotor = calloc(1, sizeof *rotor);
  if (!rotor) return fail_memory(error);
  rotor->molecule = molecule;
  rotor->fermi_ev = junction->fermi_ev;
  rotor->bonds = bonds;
  memcpy(rotor->bond, bond, (size_t)bonds * sizeof *bond);
  status = prepare(rotor, error);
  if (status == MHO_OK) *result = rotor;
  else mho_rotor_free(rotor);
  return status;
}

void mho_rotor_free(mho_rotor *rotor)
{
  if (!rotor) return;
  mho_junction_clear(&rotor->open);
  for (int k = 0; k < ROTOR_CHECKS; k++) mho_plan_free(rotor->check[k]);
  free(rotor);
}

/* E - H - Sigma without the bond (column-major, symmetric), and as columns the
 * vectors of all channels and the two ends. */
static void assemble(const mho_junction *j, double energy_ev, const int end[2],
                     double complex *matrix, double complex *column)
{
  size_t n = (size_t)j->sites, c = 0;
  for (size_t k = 0; k < n * n; k++) matrix[k] = -j->hamiltonian_ev[k];
  for (size_t i = 0; i < n; i++) matrix[i * n + i] += energy_ev;
  for (int side = 0; side < 2; side++)
    for (int a = 0; a < j->lead[side].channels; a++, c++) {
      const double *v = j->lead[side].vector + (size_t)a * n;
      double complex sigma = j->lead[side].shift_ev[a] - 0.5 * I * j->lead[side].coupling_ev[a];
      for (size_t p = 0; p < n; p++) {
        column[c * n + p] = v[p];
        for (size_t q = 0; v[p] != 0 && q < n; q++)
          if (v[q] != 0) matrix[p * n + q] -= sigma * v[p] * v[q];
      }
    }
  for (int k = 0; k < 2; k++, c++) {
    memset(column + c * n, 0, n * sizeof *column);
    column[c * n + (size_t)end[k]] = 1;
  }
}

/* Adds weight |c0 + c1 s + c2 s^2|^2. */
static void add_square(double *sum, double weight, double complex c0, double complex c1,
                       double complex c2)
{
  sum[0] += weight * creal(c0 * conj(c0));
  sum[1] += weight * 2 * creal(c0 * conj(c1));
  sum[2] += weight * (creal(c1 * conj(c1)) + 2 * creal(c0 * conj(c2)));
  sum[3] += weight * 2 * creal(c1 * conj(c2));
  sum[4] += weight * creal(c2 * conj(c2));
}

/* From G v_c and G e_p, G e_q to the polynomials. */
static void combine(const mho_junction *j, const int end[2], const double complex *column,
                    mho_twist_form *form)
{
  size_t n = (size_t)j->sites, p = (size_t)end[0], q = (size_t)end[1];
  int left = j->lead[MHO_LEFT].channels, right = j->lead[MHO_RIGHT].channels;
  const double complex *ends = column + (size_t)(left + right) * n;
  double complex a = ends[p], b = ends[q], d = ends[n + q], minor = b * b - a * d;
  add_square(form->denominator, 1.0, 1, -2 * b, minor);
  for (int l = 0; l < left; l++)
    for (int r = 0; r < right; r++) {
      const double complex *y = column + (size_t)l * n, *x = column + (size_t)(left + r) * n;
      const double *v = j->lead[MHO_RIGHT].vector + (size_t)r * n;
      double complex tau = 0, w = x[p] * y[q] + x[q] * y[p];
      for (size_t i = 0; i < n; i++) tau += v[i] * y[i];
      double weight = j->lead[MHO_LEFT].coupling_ev[l] * j->lead[MHO_RIGHT].coupling_ev[r];
      add_square(form->numerator, weight, tau, w - 2 * b * tau,
                 tau * minor + d * x[p] * y[p] + a * x[q] * y[q] - b * w);
    }
}

/* Does the form give what the plan gives, at the angles of the checks? */
static mho_status hold_against_plan(const mho_rotor *rotor, double energy_ev,
                                    const mho_twist_form *form, bool *good, mho_error *error)
{
  for (int k = 0; k < ROTOR_CHECKS && *good; k++) {
    mho_point point;
    double cosine = mho_cos_deg(check_deg[k]), value;
    mho_status status = mho_transmission_sweep(rotor->check[k], 1, &energy_ev, &point, error);
    if (status != MHO_OK) return status;
    mho_twist_form_evaluate(form, 1, &cosine, &value);
    *good = point.node ? value == 0
                       : fabs(value - point.transmission) <= CHECK_TOLERANCE * point.transmission;
  }
  return MHO_OK;
}

mho_status mho_twist_form_find(const mho_rotor *rotor, double energy_ev, mho_twist_form *form,
                               bool *good, mho_error *error)
{
  const mho_junction *j = &rotor->open;
  size_t n = (size_t)j->sites;
  int columns = j->lead[MHO_LEFT].channels + j->lead[MHO_RIGHT].channels + 2;
  *form = (mho_twist_form){.hopping_ev = rotor->hopping_ev};
  *good = false;
  if (!isfinite(energy_ev))
    return mho_fail(error, MHO_ERR_NOT_FINITE, "analysis", "energy",
                    "the energy is not a finite number");
  if (rotor->bonds > 1 || j->lead[MHO_LEFT].chain || j->lead[MHO_RIGHT].chain) return MHO_OK;
  const int *end = rotor->molecule->bond[rotor->bond[0]].site;
  double complex *matrix = malloc(n * n * sizeof *matrix);
  double complex *column = malloc(n * (size_t)columns * sizeof *column);
  bool singular = true;
  mho_status status = matrix && column ? MHO_OK : fail_memory(error);
  if (status == MHO_OK) {
    assemble(j, energy_ev, end, matrix, column);
    status = mho_solve_complex(j->sites, matrix, columns, column, &singular, error);
  }
  if (status == MHO_OK && !singular) {
    combine(j, end, column, form);
    for (int k = 1; k < 4; k += 2) /* G between the sides is exactly zero */
      if (rotor->bridge) form->numerator[k] = form->denominator[k] = 0;
    *good = true;
    status = hold_against_plan(rotor, energy_ev, form, good, error);
  }
  free(matrix);
  free(column);
  return status;
}

FOR_EVERY_PROCESSOR
static void evaluate(const mho_twist_form *form, size_t count, const double *cosine,
                     double *transmission)
{
  const double *a = form->numerator, *d = form->denominator, t = form->hopping_ev;
  if (a[1] == 0 && a[3] == 0 && d[1] == 0 && d[3] == 0) {
    double n0 = a[0], n2 = a[2] * t * t, n4 = a[4] * t * t * t * t;
    double d0 = d[0], d2 = d[2] * t * t, d4 = d[4] * t * t * t * t;
    for (size_t i = 0; i < count; i++) {
      double u = cosine[i] * cosine[i];
      transmission[i] = (n0 + u * (n2 + u * n4)) / (d0 + u * (d2 + u * d4));
    }
    return;
  }
  for (size_t i = 0; i < count; i++) {
    double s = t * cosine[i];
    transmission[i] = (a[0] + s * (a[1] + s * (a[2] + s * (a[3] + s * a[4])))) /
                      (d[0] + s * (d[1] + s * (d[2] + s * (d[3] + s * d[4]))));
  }
}

void mho_twist_form_evaluate(const mho_twist_form *form, size_t count, const double *cosine,
                             double *transmission)
{
  evaluate(form, count, cosine, transmission);
}

/* Do the terms of a polynomial cancel at s? */
static bool cancels(const double *coefficient, double s)
{
  double sum = 0, size = 0, power = 1;
  for (int k = 0; k < 5; k++, power *= s) {
    sum += coefficient[k] * power;
    size += fabs(coefficient[k] * power);
  }
  return sum < CANCELLATION * size;
}

mho_status mho_rotor_point(const mho_rotor *rotor, double energy_ev, const double *angle_deg,
                           mho_point *point, mho_error *error)
{
  mho_plan *plan;
  mho_status status = mho_rotor_turn(rotor, angle_deg, &plan, error);
  if (status == MHO_OK) status = mho_transmission_sweep(plan, 1, &energy_ev, point, error);
  mho_plan_free(plan);
  return status;
}

static mho_status by_plan(const mho_rotor *rotor, double energy_ev, double angle_deg,
                          mho_point *point, mho_error *error)
{
  double angle[MHO_TWIST_BONDS_MAX];
  for (int k = 0; k < rotor->bonds; k++) angle[k] = angle_deg;
  return mho_rotor_point(rotor, energy_ev, angle, point, error);
}

mho_status mho_rotor_sweep(const mho_rotor *rotor, double energy_ev, size_t count,
                           const double *angle_deg, mho_point *point, mho_error *error)
{
  mho_twist_form form;
  bool good;
  double channels = mho_plan_channels(rotor->check[0]);
  mho_status status = mho_twist_form_find(rotor, energy_ev, &form, &good, error);
  for (size_t i = 0; status == MHO_OK && i < count; i++) {
    if (!isfinite(angle_deg[i]))
      return mho_fail(error, MHO_ERR_NOT_FINITE, "analysis", "angle",
                      "angle %zu is not a finite number", i);
    double cosine = mho_cos_deg(angle_deg[i]), s = form.hopping_ev * cosine, value = 0;
    bool trust = good && !cancels(form.numerator, s) && !cancels(form.denominator, s);
    if (trust) mho_twist_form_evaluate(&form, 1, &cosine, &value);
    if (trust && value > DBL_MIN / DBL_EPSILON)
      point[i] = (mho_point){.transmission = fmin(value, channels),
                             .log10_transmission = log10(fmin(value, channels)),
                             .relative_error = CHECK_TOLERANCE,
                             .method = MHO_METHOD_ELIMINATION};
    else status = by_plan(rotor, energy_ev, angle_deg[i], &point[i], error);
  }
  return status;
}

mho_status mho_rotor_conductance(const mho_rotor *rotor, size_t count, const double *angle_deg,
                                 double *log10_g0, mho_error *error)
{
  mho_status status = MHO_OK;
  for (size_t i = 0; status == MHO_OK && i < count; i++) {
    double angle[MHO_TWIST_BONDS_MAX];
    for (int k = 0; k < rotor->bonds; k++) angle[k] = angle_deg[i];
    if (!isfinite(angle_deg[i]))
      status = mho_fail(error, MHO_ERR_NOT_FINITE, "analysis", "angle",
                        "angle %zu is not a finite number", i);
    else status = mho_rotor_log10(rotor, angle, &log10_g0[i], error);
  }
  return status;
}
