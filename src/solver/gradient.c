/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <mho/gradient.h>

#include <math.h>
#include <stdlib.h>

#include "solver/plan.h"

/* A tenth of what the header promises. */
#define TOLERANCE 1e-10

static mho_status fill_pairs(const mho_plan *plan, const int (*pair)[2], mho_gradient *g,
                             mho_error *error)
{
  size_t filled = 0;
  for (size_t e = 0; !pair && e < plan->entries; e++)
    if (plan->entry[e].i != plan->entry[e].j) {
      g->pair[filled][0] = plan->entry[e].i;
      g->pair[filled++][1] = plan->entry[e].j;
    }
  for (size_t p = 0; pair && p < g->pairs; p++) {
    int i = pair[p][0], j = pair[p][1];
    if (i < 0 || j < 0 || i >= plan->sites || j >= plan->sites || i == j)
      return mho_fail(error, MHO_ERR_SIZE, "solver", "pair", "pair %zu is not of two sites", p);
    g->pair[p][0] = i;
    g->pair[p][1] = j;
  }
  return MHO_OK;
}

mho_status mho_gradient_create(const mho_plan *plan, const int (*pair)[2], size_t pairs,
                               mho_gradient **result, mho_error *error)
{
  *result = NULL;
  mho_gradient *g = calloc(1, sizeof *g);
  if (!g) return mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  for (size_t e = 0; !pair && e < plan->entries; e++) pairs += plan->entry[e].i != plan->entry[e].j;
  g->sites = plan->sites;
  g->left = plan->left;
  g->right = plan->right;
  g->pairs = pairs;
  g->pair = malloc((pairs + 1) * sizeof *g->pair);
  g->onsite = calloc((size_t)plan->sites, sizeof(double));
  g->hopping = calloc(pairs + 1, sizeof(double));
  g->coupling = calloc((size_t)plan->channels, sizeof(double));
  mho_status status = MHO_OK;
  if (!g->pair || !g->onsite || !g->hopping || !g->coupling)
    status = mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  if (status == MHO_OK) status = fill_pairs(plan, pair, g, error);
  if (status == MHO_OK) *result = g;
  else mho_gradient_free(g);
  return status;
}

void mho_gradient_free(mho_gradient *g)
{
  if (!g) return;
  free(g->pair);
  free(g->onsite);
  free(g->hopping);
  free(g->coupling);
  free(g);
}

static void set_zero(mho_gradient *g)
{
  for (int i = 0; i < g->sites; i++) g->onsite[i] = 0;
  for (size_t p = 0; p < g->pairs; p++) g->hopping[p] = 0;
  for (int c = 0; c < g->left + g->right; c++) g->coupling[c] = 0;
  g->energy = g->kappa = 0;
}

static mho_status evaluate_double(const mho_plan *plan, double energy_ev, mho_gradient *g,
                                  bool *good)
{
  mho_elimination_double *w = mho_elimination_create_double(plan);
  if (!w) return MHO_ERR_MEMORY;
  mho_estimate estimate;
  mho_elimination_evaluate_double(plan, w, energy_ev, &estimate);
  *good = estimate.first_order && estimate.relative_error < TOLERANCE;
  if (*good) {
    double error = mho_elimination_differentiate_double(plan, w, energy_ev,
                                                        estimate.relative_error, g);
    *good = error <= TOLERANCE * (1 + g->kappa);
  }
  mho_elimination_free_double(w);
  return MHO_OK;
}

static mho_status evaluate_quad(const mho_plan *plan, double energy_ev, mho_gradient *g)
{
  mho_elimination_quad *w = mho_elimination_create_quad(plan);
  if (!w) return MHO_ERR_MEMORY;
  mho_estimate estimate;
  mho_elimination_evaluate_quad(plan, w, energy_ev, &estimate);
  mho_elimination_differentiate_quad(plan, w, energy_ev, estimate.relative_error, g);
  mho_elimination_free_quad(w);
  return MHO_OK;
}

static bool is_finite(const mho_gradient *g)
{
  double sum = g->energy + g->kappa;
  for (int i = 0; i < g->sites; i++) sum += fabs(g->onsite[i]);
  for (size_t p = 0; p < g->pairs; p++) sum += fabs(g->hopping[p]);
  return isfinite(sum);
}

mho_status mho_gradient_evaluate(const mho_plan *plan, double energy_ev, mho_gradient *g,
                                 mho_error *error)
{
  mho_status status = mho_plan_require_wide_band(plan, "derivatives", error);
  if (status == MHO_OK) status = mho_transmission_sweep(plan, 1, &energy_ev, &g->point, error);
  if (status != MHO_OK) return status;
  if (g->point.node) {
    set_zero(g);
    return MHO_OK;
  }
  bool good = false;
  status = evaluate_double(plan, energy_ev, g, &good);
  if (status == MHO_OK && !good) status = evaluate_quad(plan, energy_ev, g);
  if (status != MHO_OK) return mho_fail(error, status, "solver", NULL, "out of memory");
  if (!is_finite(g))
    return mho_fail(error, MHO_ERR_NOT_FINITE, "solver", "gradient",
                    "the derivatives at %g eV leave the range of a double", energy_ev);
  return MHO_OK;
}
