/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * T(E) on quadrature panels, once, for thermal averages at many Fermi levels.
 */
#ifndef MHOLECULE_ANALYSIS_THERMAL_H
#define MHOLECULE_ANALYSIS_THERMAL_H

#include <mho/transmission.h>

/* Gauss points of a panel; a grid is one panel after another. */
enum { MHO_THERMAL_POINTS = 16 };

typedef struct {
  size_t count;
  double *energy_ev, *weight_ev, *value; /* value = T * 10^-scale */
  double scale_log10;                    /* 0 unless T is near underflow */
} mho_thermal_grid;

/* Nodes that serve every Fermi level in center_ev[centers] (ascending) at kT. */
MHO_MUST_USE mho_status mho_thermal_grid_build(const mho_plan *plan,
                                               const double *center_ev,
                                               size_t centers, double kt_ev,
                                               mho_thermal_grid *grid,
                                               mho_error *error);
void mho_thermal_grid_clear(mho_thermal_grid *grid);

/* log10 of the thermal average of T at one Fermi level; -INFINITY for zero. */
double mho_thermal_average_log10(const mho_thermal_grid *grid, double fermi_ev,
                                 double kt_ev);

/* Below this kT the Fermi function is a step for every width we resolve. */
#define MHO_COLD_EV 1e-7

/* log10 of the thermal conductance (in G0) at ascending Fermi levels
 * fermi_ev[count]; -INFINITY for zero. */
MHO_MUST_USE mho_status mho_thermal_log10(const mho_plan *plan, const double *fermi_ev,
                                          size_t count, double kt_ev, double *log10_g0,
                                          mho_error *error);

#endif
