/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Conductances of a molecule whose parameters are drawn at random.
 */
#ifndef MHOLECULE_ANALYSIS_SAMPLES_H
#define MHOLECULE_ANALYSIS_SAMPLES_H

#include <mho/sensitivity.h>
#include <mho/transmission.h>

/* Samples first .. end - 1, of which sample i moves the parameters row[count]
 * (in the order of mho_parameter_list) by sigma times normal draws of stream
 * (seed, i): value[i] is log10 of the thermal conductance, -INFINITY for zero,
 * to 1e-4 decades, linear[i] what the derivatives make of the same shifts,
 * without the unmoved value.  plan is that of the unmoved molecule, fermi_ev its
 * Fermi level.  Errors: MHO_ERR_MEMORY, and those of mho_junction_build. */
MHO_MUST_USE mho_status mho_samples_draw(const mho_molecule *molecule, const mho_plan *plan,
                                         double fermi_ev, const mho_sensitivity_row *row,
                                         size_t count, uint64_t seed, size_t first, size_t end,
                                         double *value, double *linear, mho_error *error);

/* One normal draw of each of 16 streams; as mho_random_normal to rounding. */
void mho_samples_normals(uint64_t *state, double *normal);

#endif
