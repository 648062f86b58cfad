/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A user's program: one level between two contacts.
 */
#include <mho/mho.h>

#include <math.h>
#include <stdio.h>

int main(void)
{
  double level = -0.5, left = 0.02, right = 0.05, shift = 0.0, vector = 1.0;
  mho_lead a = {1, &left, &shift, &vector}, b = {1, &right, &shift, &vector};
  mho_junction junction;
  mho_plan *plan = NULL;
  mho_conductance g;
  mho_error error;
  mho_error_init(&error);
  mho_status status =
      mho_junction_from_hamiltonian(1, &level, 2, 0.0, &a, &b, &junction, &error);
  if (status == MHO_OK) status = mho_plan_create(&junction, &plan, &error);
  if (status == MHO_OK) status = mho_conductance_compute(plan, 0.0, 300.0, NULL, &g, &error);
  mho_plan_free(plan);
  mho_junction_clear(&junction);
  if (status != MHO_OK) {
    fprintf(stderr, "%s\n", error.cause[0].message);
    return 1;
  }
  printf("mho %s: %.8f G0\n", mho_version(), g.conductance_g0);
  return fabs(g.conductance_g0 - 0.0040915293) < 1e-9 ? 0 : 1;
}
