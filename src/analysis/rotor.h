/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What a rotor holds.
 */
#ifndef MHOLECULE_ANALYSIS_ROTOR_H
#define MHOLECULE_ANALYSIS_ROTOR_H

#include <mho/twist.h>

enum { ROTOR_CHECKS = 3 };

struct mho_rotor {
  const mho_molecule *molecule;
  double fermi_ev;
  int bonds, bond[MHO_TWIST_BONDS_MAX];
  double hopping_ev;               /* of the first bond, untwisted */
  bool bridge;                     /* each bond is the only link of its sides */
  mho_junction open;               /* all bonds at 90 degrees */
  mho_plan *check[ROTOR_CHECKS];   /* at the angles of mho_rotor_check_deg */
};

/* A plan with bond k at angle_deg[k]. */
MHO_MUST_USE mho_status mho_rotor_turn(const mho_rotor *rotor, const double *angle_deg,
                                       mho_plan **plan, mho_error *error);

/* log10 of the thermal conductance there. */
MHO_MUST_USE mho_status mho_rotor_log10(const mho_rotor *rotor, const double *angle_deg,
                                        double *log10_g0, mho_error *error);

#endif
