/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The plan of a junction and the ladder of methods over it.
 */
#include "solver/plan.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* The accuracy contract: max(FLOOR, 64 u kappa), and beyond CEILING the point
 * is done again in extended precision. */
#define CONTRACT_FLOOR 1e-12
#define CONTRACT_CEILING 1e-10
#define CONTRACT_KAPPA (64.0 * UNIT_ROUNDOFF)

static mho_status collect_entries(const mho_junction *junction, mho_plan *plan)
{
  size_t n = (size_t)junction->sites, count = 0;
  const double *h = junction->hamiltonian_ev;
  for (size_t i = 0; i < n; i++)
    for (size_t j = i; j < n; j++) count += h[i * n + j] != 0.0;
  plan->entry = malloc((count ? count : 1) * sizeof *plan->entry);
  if (!plan->entry) return MHO_ERR_MEMORY;
  for (size_t i = 0; i < n; i++)
    for (size_t j = i; j < n; j++)
      if (h[i * n + j] != 0.0)
        plan->entry[plan->entries++] = (mho_entry){(int)i, (int)j, h[i * n + j]};
  return MHO_OK;
}

static mho_status collect_channels(const mho_junction *junction, mho_plan *plan)
{
  size_t n = (size_t)junction->sites, m = (size_t)plan->channels;
  plan->coupling_ev = malloc(m * sizeof(double));
  plan->shift_ev = malloc(m * sizeof(double));
  plan->vector = malloc(m * n * sizeof(double));
  if (!plan->coupling_ev || !plan->shift_ev || !plan->vector) return MHO_ERR_MEMORY;
  size_t first = 0;
  for (int side = 0; side < 2; side++) {
    const mho_lead *lead = &junction->lead[side];
    size_t count = (size_t)lead->channels;
    memcpy(plan->coupling_ev + first, lead->coupling_ev, count * sizeof(double));
    memcpy(plan->shift_ev + first, lead->shift_ev, count * sizeof(double));
    memcpy(plan->vector + first * n, lead->vector, count * n * sizeof(double));
    first += count;
  }
  return MHO_OK;
}

/* <orbital k|v_c> for all levels and channels. */
static mho_status project_orbitals(const mho_junction *junction, mho_plan *plan)
{
  size_t n = (size_t)junction->sites, m = (size_t)plan->channels;
  plan->level_ev = malloc(n * sizeof(double));
  plan->amplitude = malloc(n * m * sizeof(double));
  if (!plan->level_ev || !plan->amplitude) return MHO_ERR_MEMORY;
  memcpy(plan->level_ev, junction->level_ev, n * sizeof(double));
  plan->norm_ev = fmax(fabs(plan->level_ev[0]), fabs(plan->level_ev[n - 1]));
  for (size_t k = 0; k < n; k++)
    for (size_t c = 0; c < m; c++) {
      double sum = 0;
      for (size_t i = 0; i < n; i++)
        sum += junction->orbital[k * n + i] * plan->vector[c * n + i];
      plan->amplitude[k * m + c] = sum;
    }
  return MHO_OK;
}

mho_status mho_plan_create(const mho_junction *junction, mho_plan **result,
                           mho_error *error)
{
  *result = NULL;
  if (!junction->lead[MHO_LEFT].channels || !junction->lead[MHO_RIGHT].channels)
    return mho_fail(error, MHO_ERR_CONTACTS, "solver", "electrodes",
                    "transmission needs a left and a right contact");
  mho_plan *plan = calloc(1, sizeof *plan);
  if (!plan) return mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  plan->sites = junction->sites;
  plan->left = junction->lead[MHO_LEFT].channels;
  plan->right = junction->lead[MHO_RIGHT].channels;
  plan->channels = plan->left + plan->right;
  mho_status status = mho_junction_is_connected(junction, &plan->connected, NULL);
  if (status == MHO_OK) status = collect_entries(junction, plan);
  if (status == MHO_OK) status = collect_channels(junction, plan);
  if (status == MHO_OK) status = project_orbitals(junction, plan);
  if (status != MHO_OK) {
    mho_plan_free(plan);
    return mho_fail(error, status, "solver", NULL, "out of memory");
  }
  *result = plan;
  return MHO_OK;
}

void mho_plan_free(mho_plan *plan)
{
  if (!plan) return;
  free(plan->entry);
  free(plan->coupling_ev);
  free(plan->shift_ev);
  free(plan->vector);
  free(plan->level_ev);
  free(plan->amplitude);
  free(plan);
}

int mho_plan_sites(const mho_plan *plan) { return plan->sites; }

int mho_plan_channels(const mho_plan *plan)
{
  return plan->left < plan->right ? plan->left : plan->right;
}

/* What one thread needs besides the plan; the extended one only on demand. */
typedef struct {
  mho_elimination_double *plain;
  mho_elimination_quad *extended;
} workspace;

static void set_point(const mho_plan *plan, const mho_estimate *estimate,
                      mho_method method, mho_point *point)
{
  double most = mho_plan_channels(plan);
  *point = (mho_point){.transmission = estimate->transmission,
                       .log10_transmission = estimate->log10_transmission,
                       .relative_error = estimate->relative_error,
                       .method = method};
  if (point->transmission > most) {
    point->transmission = most;
    point->log10_transmission = log10(most);
  }
}

static bool keeps_contract(const mho_estimate *estimate)
{
  double allowed = fmax(CONTRACT_FLOOR, CONTRACT_KAPPA * estimate->kappa);
  return estimate->first_order &&
         estimate->relative_error <= fmin(allowed, CONTRACT_CEILING);
}

/* The last rung: what 113 bits cannot tell from zero is a node. */
static void set_extended(const mho_plan *plan, const mho_estimate *estimate,
                         mho_point *point)
{
  set_point(plan, estimate, MHO_METHOD_EXTENDED, point);
  if (estimate->relative_error > 0.5 && !(estimate->transmission > 1e-20)) {
    *point = (mho_point){.node = true, .method = MHO_METHOD_EXTENDED};
    return;
  }
  point->unresolved =
      !estimate->first_order || !(estimate->relative_error <= CONTRACT_CEILING);
  if (!isfinite(point->relative_error)) point->relative_error = 1.0;
}

static mho_status evaluate(const mho_plan *plan, workspace *work,
                           double energy_ev, mho_point *point)
{
  mho_estimate estimate;
  if (!plan->connected) {
    *point = (mho_point){.node = true, .method = MHO_METHOD_NO_PATH};
    return MHO_OK;
  }
  mho_spectrum_evaluate(plan, energy_ev, &estimate);
  if (keeps_contract(&estimate)) {
    set_point(plan, &estimate, MHO_METHOD_SPECTRUM, point);
    return MHO_OK;
  }
  if (!work->plain) work->plain = mho_elimination_create_double(plan);
  if (!work->plain) return MHO_ERR_MEMORY;
  mho_elimination_evaluate_double(plan, work->plain, energy_ev, &estimate);
  if (keeps_contract(&estimate)) {
    set_point(plan, &estimate, MHO_METHOD_ELIMINATION, point);
    return MHO_OK;
  }
  if (!work->extended) work->extended = mho_elimination_create_quad(plan);
  if (!work->extended) return MHO_ERR_MEMORY;
  mho_elimination_evaluate_quad(plan, work->extended, energy_ev, &estimate);
  set_extended(plan, &estimate, point);
  return MHO_OK;
}

mho_status mho_transmission_sweep(const mho_plan *plan, size_t count,
                                  const double *energy_ev, mho_point *point,
                                  mho_error *error)
{
  workspace work = {0};
  mho_status status = MHO_OK;
  for (size_t i = 0; status == MHO_OK && i < count; i++) {
    if (!isfinite(energy_ev[i]))
      status = mho_fail(error, MHO_ERR_NOT_FINITE, "solver", "energy",
                        "energy %zu is not a finite number", i);
    else if (evaluate(plan, &work, energy_ev[i], &point[i]) != MHO_OK)
      status = mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  }
  mho_elimination_free_double(work.plain);
  mho_elimination_free_quad(work.extended);
  return status;
}
