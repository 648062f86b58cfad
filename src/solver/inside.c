/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <mho/inside.h>

#include <math.h>
#include <stdlib.h>

#include "base/lapack.h"
#include "solver/plan.h"

#define LEAST_FLOWING 1e-20

/* Singular values below this part of the largest are rounding. */
#define SINGULAR_ROUNDING (32 * DBL_EPSILON)

typedef struct {
  const mho_junction *junction;
  const mho_plan *plan;
  double complex *y;   /* [channels][sites] */
  double complex *tau; /* [left][right] */
} view;

static void find_currents(const mho_plan *plan, const mho_elimination_quad *w,
                          mho_inside *result)
{
  for (size_t e = 0; e < plan->entries; e++) {
    int i = plan->entry[e].i, j = plan->entry[e].j;
    if (i == j) continue;
    double flow = 2 * plan->entry[e].value_ev * mho_elimination_flow_quad(plan, w, i, j);
    result->bond[result->bonds++] = (mho_bond_current){i, j, flow};
  }
}

static mho_status solve(view *v, double energy_ev, mho_inside *result, mho_error *error)
{
  const mho_plan *plan = v->plan;
  size_t n = (size_t)plan->sites, m = (size_t)plan->channels;
  mho_elimination_quad *w = mho_elimination_create_quad(plan);
  v->y = malloc(m * n * sizeof *v->y);
  v->tau = calloc((size_t)plan->left * (size_t)plan->right, sizeof *v->tau);
  mho_status status = MHO_OK;
  if (!w || !v->y || !v->tau)
    status = mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  if (status == MHO_OK) {
    mho_estimate estimate;
    mho_elimination_evaluate_quad(plan, w, energy_ev, &estimate);
    mho_elimination_solutions_quad(plan, w, v->y);
    find_currents(plan, w, result);
  }
  mho_elimination_free_quad(w);
  for (size_t pair = 0; status == MHO_OK && pair < (size_t)plan->left * (size_t)plan->right; pair++) {
    size_t a = pair / (size_t)plan->right, b = pair % (size_t)plan->right + (size_t)plan->left;
    for (size_t k = plan->support_start[b]; k < plan->support_start[b + 1]; k++) {
      size_t i = (size_t)plan->support[k];
      v->tau[pair] += plan->vector[b * n + i] * v->y[a * n + i];
    }
  }
  return status;
}

/* An amplitude on a contact below this is rounding of a state that it does not see. */
#define AMPLITUDE_ROUNDING 1e-13

static double seen(double amplitude)
{
  return fabs(amplitude) > AMPLITUDE_ROUNDING ? amplitude : 0;
}

/* Orbital k's part of tau, and its shares of T. */
static void find_orbitals(const view *v, mho_inside *result)
{
  const mho_plan *plan = v->plan;
  size_t n = (size_t)plan->sites, m = (size_t)plan->channels;
  for (size_t k = 0; k < n; k++) {
    const double *orbital = v->junction->orbital + k * n, *on_contact = plan->amplitude + k * m;
    mho_orbital_share *share = &result->orbital[result->orbitals++];
    *share = (mho_orbital_share){.level_ev = plan->level_ev[k]};
    for (size_t a = 0; a < (size_t)plan->left; a++)
      for (size_t b = (size_t)plan->left; b < m; b++) {
        double complex in_a = 0, in_b = 0;
        for (size_t i = 0; i < n; i++) {
          in_a += orbital[i] * v->y[a * n + i];
          in_b += orbital[i] * v->y[b * n + i];
        }
        double complex part = 0.5 * (seen(on_contact[b]) * in_a + seen(on_contact[a]) * in_b);
        double complex tau = v->tau[a * (size_t)plan->right + b - (size_t)plan->left];
        double weight = plan->coupling_ev[a] * plan->coupling_ev[b];
        double alone = weight * creal(part * conj(part));
        share->alone += alone;
        share->interference += weight * creal(part * conj(tau)) - alone;
      }
  }
}

/* t_ba = sqrt(Gamma_a Gamma_b) tau_ba by singular values: t^+ t itself would lose the
 * small ones to rounding of the largest. */
static mho_status find_channels(const view *v, mho_inside *result, mho_error *error)
{
  const mho_plan *plan = v->plan;
  size_t l = (size_t)plan->left, r = (size_t)plan->right, n = result->eigenchannels;
  double complex *t = malloc((l * r + n * (l + r)) * sizeof *t);
  if (!t) return mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  double complex *left = t + l * r, *right = left + n * l;
  double *singular = result->eigenchannel;
  for (size_t a = 0; a < l; a++)
    for (size_t b = 0; b < r; b++)
      t[b * l + a] = sqrt(plan->coupling_ev[a]) * sqrt(plan->coupling_ev[l + b]) * v->tau[a * r + b];
  mho_status status = mho_singular_complex((int)l, (int)r, t, singular, left, right, error);
  double least = SINGULAR_ROUNDING * singular[0];
  for (size_t k = 0; status == MHO_OK && k < n; k++) {
    double value = singular[k] > least ? singular[k] : 0;
    result->eigenchannel[k] = fmin(1.0, value * value);
    for (size_t a = 0; a < l; a++)
      result->left_part[k * l + a] = creal(left[k * l + a] * conj(left[k * l + a]));
    for (size_t b = 0; b < r; b++)
      result->right_part[k * r + b] = creal(right[b * n + k] * conj(right[b * n + k]));
  }
  free(t);
  return status;
}

static mho_status allocate(const mho_plan *plan, mho_inside *result, mho_error *error)
{
  result->eigenchannels = (size_t)mho_plan_channels(plan);
  result->bond = malloc((plan->entries + 1) * sizeof *result->bond);
  result->orbital = malloc((size_t)plan->sites * sizeof *result->orbital);
  result->eigenchannel = calloc(result->eigenchannels, sizeof(double));
  result->left_part = calloc(result->eigenchannels * (size_t)plan->left, sizeof(double));
  result->right_part = calloc(result->eigenchannels * (size_t)plan->right, sizeof(double));
  if (!result->bond || !result->orbital || !result->eigenchannel || !result->left_part ||
      !result->right_part)
    return mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  return MHO_OK;
}

static bool is_finite(const mho_inside *result)
{
  double sum = result->transmission;
  for (size_t k = 0; k < result->bonds; k++) sum += fabs(result->bond[k].flow);
  for (size_t k = 0; k < result->orbitals; k++)
    sum += result->orbital[k].alone + fabs(result->orbital[k].interference);
  return isfinite(sum);
}

/* plan: of wide bands. */
static mho_status compute(const mho_junction *junction, const mho_plan *plan, double energy_ev,
                          mho_inside *result, mho_error *error)
{
  view v = {junction, plan, NULL, NULL};
  mho_point point;
  mho_status status = mho_transmission_sweep(plan, 1, &energy_ev, &point, error);
  if (status == MHO_OK) status = solve(&v, energy_ev, result, error);
  if (status == MHO_OK) {
    result->transmission = point.transmission;
    result->flows = !point.node && point.transmission > LEAST_FLOWING;
    find_orbitals(&v, result);
    status = find_channels(&v, result, error);
  }
  if (status == MHO_OK && !is_finite(result))
    status = mho_fail(error, MHO_ERR_NOT_FINITE, "solver", "inside",
                      "the solution at %g eV leaves the range of a double", energy_ev);
  free(v.y);
  free(v.tau);
  return status;
}

/* Outside the band of an electrode nothing flows. */
static void fill_closed(const mho_plan *plan, mho_inside *result)
{
  result->outside_band = true;
  for (size_t e = 0; e < plan->entries; e++)
    if (plan->entry[e].i != plan->entry[e].j)
      result->bond[result->bonds++] = (mho_bond_current){plan->entry[e].i, plan->entry[e].j, 0};
  for (int k = 0; k < plan->sites; k++)
    result->orbital[result->orbitals++] = (mho_orbital_share){.level_ev = plan->level_ev[k]};
}

/* Every view is of one energy, and so of one Sigma. */
static mho_status compute_frozen(const mho_junction *junction, const mho_plan *plan,
                                 double energy_ev, mho_inside *result, mho_error *error)
{
  mho_frozen frozen;
  mho_status status = mho_frozen_create(plan, &frozen);
  if (status != MHO_OK) mho_fail(error, status, "solver", NULL, "out of memory");
  else if (mho_frozen_set(plan, energy_ev, &frozen))
    status = compute(junction, &frozen.plan, energy_ev, result, error);
  else fill_closed(plan, result);
  mho_frozen_clear(&frozen);
  return status;
}

mho_status mho_inside_compute(const mho_junction *junction, const mho_plan *plan,
                              double energy_ev, mho_inside *result, mho_error *error)
{
  *result = (mho_inside){0};
  if (junction->sites != plan->sites || !plan->level_ev)
    return mho_fail(error, MHO_ERR_SIZE, "solver", "junction",
                    "the plan was not made of this junction");
  mho_status status = allocate(plan, result, error);
  if (status != MHO_OK) return status;
  return (mho_plan_has_chain(plan) ? compute_frozen : compute)(junction, plan, energy_ev, result,
                                                               error);
}

void mho_inside_clear(mho_inside *result)
{
  free(result->bond);
  free(result->orbital);
  free(result->eigenchannel);
  free(result->left_part);
  free(result->right_part);
  *result = (mho_inside){0};
}
