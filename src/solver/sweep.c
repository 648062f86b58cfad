/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The ladder of methods: the first that keeps the accuracy contract is taken.
 */
#include <math.h>

#include "solver/plan.h"

/* The accuracy contract: max(FLOOR, 64 u kappa), and beyond CEILING the point
 * is done again in extended precision. */
#define CONTRACT_FLOOR 1e-12
#define CONTRACT_CEILING 1e-10
#define CONTRACT_KAPPA (64.0 * UNIT_ROUNDOFF)

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
  if (plan->level_ev) {
    mho_spectrum_evaluate(plan, energy_ev, &estimate);
    if (keeps_contract(&estimate)) {
      set_point(plan, &estimate, MHO_METHOD_SPECTRUM, point);
      return MHO_OK;
    }
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
