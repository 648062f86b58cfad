/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The parameters of a molecule as a list, and the molecule with some moved.
 */
#ifndef MHOLECULE_ANALYSIS_PERTURB_H
#define MHOLECULE_ANALYSIS_PERTURB_H

#include <mho/sensitivity.h>

/* A molecule with sites and bonds of its own, freed by freeing those two (also
 * after a failure); everything else stays the original's. */
MHO_MUST_USE mho_status mho_copy_numbers(const mho_molecule *from, mho_molecule *to,
                                         mho_error *error);

/* Every parameter with its sigma, in a fixed order; the caller frees *row. */
MHO_MUST_USE mho_status mho_parameter_list(const mho_molecule *molecule,
                                           const mho_uncertainties *sigma,
                                           mho_sensitivity_row **row, size_t *count,
                                           mho_error *error);

/* log10 of the thermal conductance with parameter p moved by shift[p];
 * -INFINITY for zero.  fermi_ev is the unmoved Fermi level. */
MHO_MUST_USE mho_status mho_perturbed_log10(const mho_molecule *molecule, double fermi_ev,
                                            const mho_sensitivity_row *row, size_t count,
                                            const double *shift, double *log10_g0,
                                            mho_error *error);

#endif
