/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Where a molecule falls apart between its contacts.  Every way from left to
 * right passes the cut sites c_0 ... c_m one after the other (c_0 and c_m are
 * the contacts).  A link is what hangs between two neighbours of them, or at one
 * (a side group), and
 *
 *   P(E) = product of P of the links and of the hoppings that bridge,
 *
 * P of a link between its own two cut sites, and det(E - H) of a side group: a
 * path takes all cut sites out of the molecule, and P is the sum over paths of
 * their hoppings times det(E - H) of what they leave (F. Harary, SIAM Rev. 4, 202
 * (1962)).
 */
#ifndef MHOLECULE_SOLVER_CHAIN_H
#define MHOLECULE_SOLVER_CHAIN_H

#include "solver/plan.h"

typedef struct {
  int first, last; /* numbers of its cut sites; the same: a side group */
  int sites;       /* with the cut sites, which are site[0] and, of two, site[1] */
  int *site;
} mho_link;

/* Sites are those of the plan; plan->sites and the next number stand for the
 * contacts, which hop to v_l and v_r. */
typedef struct {
  int sites;                 /* plan->sites + 2 */
  int *start, *next;         /* neighbours of a site */
  double *hopping, *onsite;  /* beside next; of each site */
  int cuts, *cut;            /* from left to right, contacts included */
  int links;
  mho_link *link; /* from left to right */
  int *room;      /* what link[].site points to */
  int apart;      /* sites that nothing joins to the contacts */
} mho_chain;

/* For a connected plan with one channel a contact; the caller clears the chain,
 * also after a failure.  Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_chain_create(const mho_plan *plan, mho_chain *chain);
void mho_chain_clear(mho_chain *chain);

/* Sites of the piece from link `first` to link `last`, its two outer cut sites
 * first; site[] and mark[] have room for all, mark[] is false before and after. */
int mho_chain_piece(const mho_chain *chain, int first, int last, int *site, bool *mark);

/* H of some sites, [count][count]; the first `ends` of them lie at 0, as P does
 * not depend on the energies of the contacts' sites.  place[chain->sites] is -1
 * before and after. */
void mho_chain_hamiltonian(const mho_chain *chain, int count, const int *site, int ends,
                           int *place, double *h);

#endif
