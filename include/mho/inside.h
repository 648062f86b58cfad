/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What happens inside a junction at one energy: currents through bonds, what
 * each orbital of the bare molecule adds, and the eigenchannels of contacts
 * with several channels.  y_a = G v_a for the channels a of the left contact.
 */
#ifndef MHOLECULE_INSIDE_H
#define MHOLECULE_INSIDE_H

#include <mho/transmission.h>

typedef struct {
  int from, to; /* from < to */
  double flow;  /* from -> to, of electrons that come from the left; can be < 0 */
} mho_bond_current;

typedef struct {
  double level_ev;
  double alone;        /* T if it were the only orbital */
  double interference; /* with all others; alone + interference add up to T */
} mho_orbital_share;

typedef struct {
  double transmission;
  bool flows; /* T > 1e-20; else the currents are rounding */
  bool outside_band; /* of an electrode: nothing flows, all values are 0 */
  size_t bonds, orbitals, eigenchannels;
  mho_bond_current *bond;   /* every non-zero hopping */
  mho_orbital_share *orbital; /* by ascending level */
  double *eigenchannel;     /* of each its T, largest first; 0 what is rounding of the first */
  /* |.|^2 of an eigenchannel in the channels of a contact, whose sum is 1:
   * [eigenchannels][channels of the left, of the right contact]. */
  double *left_part, *right_part;
} mho_inside;

MHO_BEGIN_DECLARATIONS

/* Views of the junction that the plan was made of, in 113 bits.
 *
 * Bond currents J_mn = 2 H_nm Im (G Gamma_L G^+)_mn: every cut that separates
 * the contacts sums to T, and what flows into a site off the contacts flows
 * out of it.  Orbital k adds to tau_ba
 *   c_k = [ (v_b.k)(k.y_a) + (y_b.k)(k.v_a) ] / 2,
 * `alone` is sum Gamma_a Gamma_b |c_k|^2.  Eigenchannels are the squared singular
 * values of t_ba = sqrt(Gamma_a Gamma_b) tau_ba, their parts its singular vectors.
 * These laws hold to 1e-10 of the largest while T > 1e-20; below, what is left
 * is rounding.  The caller clears the result, also after a
 * failure.  Errors: MHO_ERR_SIZE (plan and junction differ),
 * MHO_ERR_NOT_FINITE, MHO_ERR_MEMORY, MHO_ERR_LINEAR_ALGEBRA. */
MHO_API MHO_MUST_USE mho_status mho_inside_compute(const mho_junction *junction,
                                                   const mho_plan *plan,
                                                   double energy_ev,
                                                   mho_inside *result,
                                                   mho_error *error);
MHO_API void mho_inside_clear(mho_inside *result);

MHO_END_DECLARATIONS

#endif
