/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * T(E) on quadrature panels, once, for thermal averages at many Fermi levels.
 */
#ifndef MHOLECULE_ANALYSIS_THERMAL_H
#define MHOLECULE_ANALYSIS_THERMAL_H

#include <mho/conductance.h>
#include <mho/sensitivity.h>
#include <mho/transmission.h>

/* Gauss points of a panel; a grid is one panel after another. */
enum { MHO_THERMAL_POINTS = 16 };

typedef struct {
  size_t count;
  double *energy_ev, *weight_ev, *value; /* value = T * 10^-scale */
  double scale_log10;                    /* 0 unless T is near underflow */
} mho_thermal_grid;

/* Points that serve every Fermi level in center_ev[centers] (ascending) at kT; none
 * where all lie outside the band.  pole[sites] are the plan's if the caller has
 * them, else NULL, as for chains as electrodes. */
MHO_MUST_USE mho_status mho_thermal_grid_build(const mho_plan *plan, const mho_pole *pole,
                                               const double *center_ev,
                                               size_t centers, double kt_ev,
                                               mho_thermal_grid *grid,
                                               mho_error *error);
void mho_thermal_grid_clear(mho_thermal_grid *grid);

/* Below this kT the Fermi function is a step for every width we resolve. */
#define MHO_COLD_EV 1e-7

/* log10 of the thermal conductance (in G0) at ascending Fermi levels
 * fermi_ev[count]; -INFINITY for zero.  pole as above. */
MHO_MUST_USE mho_status mho_thermal_log10(const mho_plan *plan, const mho_pole *pole,
                                          const double *fermi_ev, size_t count, double kt_ev,
                                          double *log10_g0, mho_error *error);

/* mho_conductance_compute and mho_sensitivity_compute for a caller who has the
 * plan of the junction and its poles. */
MHO_MUST_USE mho_status mho_conductance_with_poles(const mho_plan *plan, const mho_pole *pole,
                                                   double fermi_ev, double temperature_k,
                                                   const mho_conductance_options *options,
                                                   mho_conductance *result, mho_error *error);
MHO_MUST_USE mho_status mho_sensitivity_with_poles(const mho_molecule *molecule,
                                                   const mho_plan *plan, const mho_pole *pole,
                                                   double fermi_ev,
                                                   const mho_sensitivity_options *options,
                                                   mho_sensitivity *result, mho_error *error);

#endif
