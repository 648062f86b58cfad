/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The one place that knows what an electrode is: Sigma at an energy.
 */
#include <math.h>

#include "solver/plan.h"

/* Gamma and shift of a chain's end (D. M. Newns, Phys. Rev. 178, 1123 (1969)). */
static bool chain_sigma(const mho_chain_electrode *chain, double energy_ev, double *coupling_ev,
                        double *shift_ev)
{
  double x = (energy_ev - chain->center_ev) / (2 * chain->hopping_ev);
  double strength = chain->joint_ev * (chain->joint_ev / chain->hopping_ev);
  *shift_ev = strength * x;
  if (!(fabs(x) < 1)) return false;
  *coupling_ev = 2 * fabs(strength) * sqrt((1 - x) * (1 + x));
  return true;
}

bool mho_plan_electrodes(const mho_plan *plan, double energy_ev, double *coupling_ev,
                         double *shift_ev)
{
  bool inside = true;
  for (int c = 0; c < plan->channels; c++) {
    int side = c < plan->left ? MHO_LEFT : MHO_RIGHT;
    coupling_ev[c] = plan->coupling_ev[c];
    shift_ev[c] = plan->shift_ev[c];
    if (plan->has_chain[side])
      inside = chain_sigma(&plan->chain[side], energy_ev, &coupling_ev[c], &shift_ev[c]) && inside;
  }
  return inside;
}

mho_status mho_plan_require_wide_band(const mho_plan *plan, const char *what, mho_error *error)
{
  if (!plan->has_chain[MHO_LEFT] && !plan->has_chain[MHO_RIGHT]) return MHO_OK;
  return mho_fail(error, MHO_ERR_RANGE, "solver", "electrodes",
                  "%s need electrodes of a wide band, not a chain", what);
}
