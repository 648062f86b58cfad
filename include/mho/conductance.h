/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Zero-bias conductance at temperature,
 *   G = G0 * integral of T(E) (-df/dE) dE,
 * at the Fermi level and over an alignment window around it, because nobody
 * knows where the Fermi level of a junction lies.
 */
#ifndef MHOLECULE_CONDUCTANCE_H
#define MHOLECULE_CONDUCTANCE_H

#include <mho/junction.h>
#include <mho/transmission.h>

#define MHO_DEFAULT_WINDOW_EV 0.5

/* Quantiles that bound the range over the window. */
#define MHO_WINDOW_LOW_QUANTILE 0.05
#define MHO_WINDOW_HIGH_QUANTILE 0.95

typedef struct {
  double window_ev; /* half width of the alignment window, >= 0 */
} mho_conductance_options;

typedef struct {
  double fermi_ev;
  double temperature_k;
  mho_point at_fermi;     /* T(E_F) */
  double conductance_g0;  /* thermal; 0 where it underflows or is a node */
  double conductance_s;
  bool has_log;           /* false where the conductance is exactly zero */
  double log10_g0;
  bool has_window_low, has_window_high;
  double window_low_log10_g0, window_high_log10_g0;
  unsigned warnings;      /* near-pole, near-node, no-pi-path, outside-band */
} mho_conductance;

MHO_BEGIN_DECLARATIONS

MHO_API mho_conductance_options mho_conductance_defaults(void);

/* T is rational, and its poles say where a quadrature must be fine: panels are
 * halved until every pole and the Fermi function's own lie outside an ellipse
 * on which 16 Gauss points give 12 digits.  With chains as electrodes T is not, and
 * panels grow finer towards the edges of the band.  Quantiles are over an even grid of
 * 401 Fermi levels.  At 0 K the conductance is T(E_F).
 * Errors: MHO_ERR_RANGE (window), MHO_ERR_MEMORY, MHO_ERR_LINEAR_ALGEBRA. */
MHO_API MHO_MUST_USE mho_status mho_conductance_compute(
    const mho_plan *plan, double fermi_ev, double temperature_k,
    const mho_conductance_options *options, mho_conductance *result,
    mho_error *error);

/* Warnings that the molecule and its levels carry by themselves: charged,
 * open-shell, near-degenerate-frontier, strong-twist. */
MHO_API unsigned mho_molecule_warnings(const mho_molecule *molecule,
                                       const mho_junction *junction);

MHO_END_DECLARATIONS

#endif
