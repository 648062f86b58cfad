/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The one place that knows what an electrode is: Sigma at an energy.
 */
#include <math.h>
#include <stdlib.h>

#include "solver/plan.h"

/* Gamma and shift of a chain's end (D. M. Newns, Phys. Rev. 178, 1123 (1969));
 * false outside the band. */
static bool chain_sigma(const mho_chain_electrode *chain, double energy_ev, double *coupling_ev,
                        double *shift_ev)
{
  double x = (energy_ev - chain->center_ev) / (2 * chain->hopping_ev);
  double strength = chain->joint_ev * (chain->joint_ev / chain->hopping_ev);
  *shift_ev = strength * x;
  *coupling_ev = 0;
  if (!(fabs(x) < 1)) return false;
  *coupling_ev = 2 * fabs(strength) * sqrt((1 - x) * (1 + x));
  return true;
}

bool mho_plan_has_chain(const mho_plan *plan)
{
  return plan->has_chain[MHO_LEFT] || plan->has_chain[MHO_RIGHT];
}

void mho_plan_band(const mho_plan *plan, double *low_ev, double *high_ev)
{
  *low_ev = -INFINITY;
  *high_ev = INFINITY;
  for (int side = 0; side < 2; side++) {
    const mho_chain_electrode *chain = &plan->chain[side];
    if (!plan->has_chain[side]) continue;
    *low_ev = fmax(*low_ev, chain->center_ev - 2 * fabs(chain->hopping_ev));
    *high_ev = fmin(*high_ev, chain->center_ev + 2 * fabs(chain->hopping_ev));
  }
}

mho_status mho_frozen_create(const mho_plan *plan, mho_frozen *frozen)
{
  size_t m = (size_t)plan->channels;
  *frozen = (mho_frozen){.plan = *plan, .sigma = malloc(2 * m * sizeof(double))};
  if (!frozen->sigma) return MHO_ERR_MEMORY;
  frozen->plan.has_chain[MHO_LEFT] = frozen->plan.has_chain[MHO_RIGHT] = false;
  frozen->plan.coupling_ev = frozen->sigma;
  frozen->plan.shift_ev = frozen->sigma + m;
  if (!plan->contacts) return MHO_OK;
  frozen->contacts = *plan->contacts;
  frozen->contacts.coupling_ev = frozen->plan.coupling_ev;
  frozen->contacts.shift_ev = frozen->plan.shift_ev;
  return MHO_OK;
}

void mho_frozen_clear(mho_frozen *frozen) { free(frozen->sigma); }

bool mho_frozen_set(const mho_plan *plan, double energy_ev, mho_frozen *frozen)
{
  bool open = true;
  /* the struct may have moved since */
  if (plan->contacts) frozen->plan.contacts = &frozen->contacts;
  for (int c = 0; c < plan->channels; c++) {
    int side = c < plan->left ? MHO_LEFT : MHO_RIGHT;
    double *coupling = &frozen->plan.coupling_ev[c], *shift = &frozen->plan.shift_ev[c];
    *coupling = plan->coupling_ev[c];
    *shift = plan->shift_ev[c];
    if (plan->has_chain[side])
      open = chain_sigma(&plan->chain[side], energy_ev, coupling, shift) && open;
  }
  return open;
}

mho_status mho_plan_require_wide_band(const mho_plan *plan, const char *what, mho_error *error)
{
  if (!mho_plan_has_chain(plan)) return MHO_OK;
  return mho_fail(error, MHO_ERR_RANGE, "solver", "electrodes",
                  "%s need electrodes of a wide band, not a chain", what);
}
