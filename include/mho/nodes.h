/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Where the transmission vanishes.  With one channel a contact,
 * T = Gamma_L Gamma_R |P/D|^2 where P(E) = v_r^T adj(E - H) v_l is a real
 * polynomial that does not depend on Gamma.  Its real zeros are exact nodes, a
 * complex pair is a dip of T near its real part.
 */
#ifndef MHOLECULE_NODES_H
#define MHOLECULE_NODES_H

#include <mho/transmission.h>

typedef enum {
  MHO_NODE_EXACT,  /* T = 0 at a real energy */
  MHO_NODE_DIP,    /* a pair of zeros at energy +- i imaginary */
  MHO_NODE_MINIMUM /* a local minimum of T, where contacts have more channels */
} mho_node_kind;

typedef struct {
  mho_node_kind kind;
  double energy_ev;
  double imaginary_ev; /* > 0 for a dip, else 0 */
  int order;           /* multiplicity of the zero; 0 for a minimum */
} mho_node;

typedef struct {
  size_t count;
  mho_node *node;  /* by ascending energy */
  bool everywhere; /* P = 0: by symmetry, or because no path joins the contacts */
  int unseen;      /* states that no contact sees; they cancel from P and D */
  int zeros;       /* zeros with multiplicity, a dip counting twice */
} mho_nodes;

/* Sites of a link (below) up to which nodes are searched, and up to which in 113
 * bits where doubles do not tell them apart; beyond, minima are. */
enum { MHO_NODES_STATES_MAX = 1000, MHO_NODES_EXTENDED_MAX = 200 };

MHO_BEGIN_DECLARATIONS

/* All nodes of a plan; the caller clears the result, also after a failure.
 *
 * P is the product of those of the links, the parts of the molecule between
 * neighbours of the sites that every way from left to right passes, and of det(E - H)
 * of the groups that hang on such a site (F. Harary, SIAM Rev. 4, 202 (1962)): equal
 * links are solved once, and a node of six rings is six times that of one.  States
 * that neither contact sees cancel, of a link or between links; how many there are
 * in all is counted in exact arithmetic modulo a prime (amplitudes below 1e-13 at
 * both are none).  Zeros of a link start from the closed-loop matrix of the bordered pencil
 * [[H, v_l], [v_r^T, 0]] - E diag(1, 0) without its infinite zeros (A.
 * Emami-Naeini and P. Van Dooren, Automatica 18, 415 (1982)), are polished on P
 * itself to twice the digits of a double, kept apart by discs that hold one
 * each, and where discs meet counted by the argument principle.  Zeros within
 * 1e-13 of the largest level are one node of their joint order.  What doubles
 * do not separate is searched in 113 bits.
 * Errors: MHO_ERR_MEMORY, MHO_ERR_LINEAR_ALGEBRA, MHO_ERR_NOT_CONVERGED. */
MHO_API MHO_MUST_USE mho_status mho_nodes_find(const mho_plan *plan,
                                               mho_nodes *result,
                                               mho_error *error);
MHO_API void mho_nodes_clear(mho_nodes *result);

/* The exact nodes at low_ev < E < high_ev alone, in the time of some sums over
 * the levels: for the gap between HOMO and LUMO of many molecules.  An end that
 * is a level may be given; a node within 1e-10 eV of it counts as one at the
 * level, not between.  `zeros` is the sum of orders, `unseen` is not counted.
 * Where rounding hides a zero, or contacts have several channels (minima), it
 * takes mho_nodes_find and its time.
 * Errors: MHO_ERR_RANGE (energies), and those of mho_nodes_find. */
MHO_API MHO_MUST_USE mho_status mho_nodes_between(const mho_plan *plan,
                                                  double low_ev, double high_ev,
                                                  mho_nodes *result,
                                                  mho_error *error);

MHO_END_DECLARATIONS

#endif
