/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Thermal conductance with one site changed, for many such changes at once.
 */
#ifndef MHOLECULE_ANALYSIS_SITE_CHANGE_H
#define MHOLECULE_ANALYSIS_SITE_CHANGE_H

#include <mho/junction.h>

enum { MHO_CHANGE_BONDS = 2, MHO_CHANGE_CHAIN = 2 };

/* H' - H: the site's energy, its hoppings, and sites hung on it in a chain. */
typedef struct {
  int site;
  double onsite_ev;
  int bonds, partner[MHO_CHANGE_BONDS];
  double hopping_ev[MHO_CHANGE_BONDS];
  int chain;
  double chain_onsite_ev[MHO_CHANGE_CHAIN], chain_hopping_ev[MHO_CHANGE_CHAIN];
} mho_site_change;

/* log10 of the thermal conductance at fermi_ev[levels] (ascending) into
 * log10_g0[count][levels], to 1e-8.  good[k] is false, and the row left alone,
 * where that precision is not reached: near nodes, for contacts of several
 * channels, beside resonances that the quadrature of the unchanged junction does
 * not resolve.
 * Errors: MHO_ERR_MEMORY, MHO_ERR_LINEAR_ALGEBRA. */
MHO_MUST_USE mho_status mho_site_changes(const mho_junction *junction,
                                         const mho_site_change *change, size_t count,
                                         const double *fermi_ev, size_t levels, double kt_ev,
                                         double *log10_g0, bool *good, mho_error *error);

#endif
