/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Constants of nature, exact since the SI of 2019 (BIPM, The International
 * System of Units, 9th edition).
 */
#ifndef MHOLECULE_CONSTANTS_H
#define MHOLECULE_CONSTANTS_H

#define MHO_ELEMENTARY_CHARGE_C 1.602176634e-19
#define MHO_PLANCK_J_S 6.62607015e-34
#define MHO_BOLTZMANN_J_PER_K 1.380649e-23
#define MHO_AVOGADRO_PER_MOL 6.02214076e23

/* k/e: Boltzmann's constant in eV/K. */
#define MHO_BOLTZMANN_EV_PER_K (MHO_BOLTZMANN_J_PER_K / MHO_ELEMENTARY_CHARGE_C)

/* Conductance quantum G0 = 2e^2/h in S. */
#define MHO_CONDUCTANCE_QUANTUM_S \
  (2.0 * MHO_ELEMENTARY_CHARGE_C * MHO_ELEMENTARY_CHARGE_C / MHO_PLANCK_J_S)

#endif
