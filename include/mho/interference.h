/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Where should the linkers go?  All pairs of sites as contacts, at the Fermi
 * level, with one coupling Gamma each.
 *
 * With g = (E - H)^-1 of the bare molecule and y = Gamma/2, the 2x2 block of a
 * pair gives T = Gamma^2 g_ij^2 / |(1 + i y g_ii)(1 + i y g_jj) + y^2 g_ij^2|^2,
 * so one factorisation (the levels of the molecule) serves every pair.
 */
#ifndef MHOLECULE_INTERFERENCE_H
#define MHOLECULE_INTERFERENCE_H

#include <mho/conductance.h>
#include <mho/junction.h>

/* X(code, word) */
#define MHO_PAIR_LIST(X)                                                       \
  X(MHO_PAIR_CONSTRUCTIVE, "constructive")                                     \
  X(MHO_PAIR_NEAR_NODE, "near-node")                                           \
  X(MHO_PAIR_NODE_SYMMETRY, "node-symmetry")                                   \
  X(MHO_PAIR_NODE_CANCELLATION, "node-cancellation")                           \
  X(MHO_PAIR_NO_PATH, "no-path")

typedef enum {
#define MHO_PAIR_CODE(code, word) code,
  MHO_PAIR_LIST(MHO_PAIR_CODE)
#undef MHO_PAIR_CODE
} mho_pair_class;

/* What a rule of thumb says of a pair. */
typedef enum { MHO_RULE_SILENT, MHO_RULE_CONDUCTS, MHO_RULE_NODE } mho_rule_verdict;

typedef struct {
  int site[2];
  double transmission; /* 0 at a node */
  bool has_green;      /* false where the Fermi level is a level */
  double green_per_ev; /* g_ij, with its sign; 0 at an exact node */
  char *magic;         /* K |beta g_ij| as a decimal integer, or NULL */
  mho_pair_class kind;
  bool has_node;       /* a real node was found */
  double node_ev;      /* the nearest one, above the Fermi level */
  int node_order;      /* 0: odd, not counted (large molecules) */
  bool has_shift;
  double overturning_shift_ev; /* smallest move of E_F that turns the verdict */
  mho_rule_verdict starring, orbital, cross_conjugation;
} mho_pair;

typedef struct {
  double coupling_ev; /* Gamma of both contacts */
  bool every_site;    /* false: sites with at most two bonds */
  bool nodes;         /* look for nodes and overturning shifts */
  bool rules;         /* evaluate the rules of thumb */
  bool magic;
} mho_interference_options;

typedef struct {
  size_t count;
  mho_pair *pair; /* i < j, in order of i, then j */
} mho_interference;

/* A pair conducts where |g_ij| is at least this part of the largest among the
 * pairs as many bonds apart, one more or one less: a hundredth in T. */
#define MHO_PAIR_CONDUCTS 0.1

/* Nodes from the Green's function's zeros up to here; above, from changes of
 * sign on a grid about the Fermi level. */
enum { MHO_INTERFERENCE_NODES_MAX = 80, MHO_INTERFERENCE_SITES_MAX = 2000 };

MHO_BEGIN_DECLARATIONS

/* Gamma of the molecule's left contact; everything but `every_site`. */
MHO_API mho_interference_options
mho_interference_defaults(const mho_molecule *molecule);

/* The map of a molecule; contacts it may have do not count.
 *
 * An exact node is one by symmetry where all sites share the Fermi level as
 * their energy and both stand in the same half of a two-coloured molecule (the
 * pairing of levels at +-E makes g_ij odd in E: C. A. Coulson and G. S.
 * Rushbrooke, Proc. Camb. Phil. Soc. 36, 193 (1940)), and by cancellation
 * elsewhere.  Magic integers are K (B^-1)_ij in exact arithmetic, B the
 * adjacency of the two halves and K = |det B| its Kekule structures, where all
 * sites share one energy, all bonds one hopping and all rings are hexagons
 * (Y. Geng et al., J. Am. Chem. Soc. 137, 4469 (2015)).
 * Pairs that a symmetry of H turns into each other are computed once and have
 * the same values.  Nodes are exact up to MHO_INTERFERENCE_NODES_MAX sites;
 * above, they are changes of sign between samples in the gaps next to the Fermi
 * level, 24 on either side, and `node_order` is 0.
 * The caller clears the result, also after a failure.
 * Errors: MHO_ERR_LIMIT (sites), MHO_ERR_RANGE (coupling), MHO_ERR_MEMORY,
 * MHO_ERR_LINEAR_ALGEBRA. */
MHO_API MHO_MUST_USE mho_status mho_interference_map(
    const mho_molecule *molecule, const mho_junction *junction,
    const mho_interference_options *options, mho_interference *map,
    mho_error *error);
MHO_API void mho_interference_clear(mho_interference *map);

/* `constructive`, `near-node` ... */
MHO_API const char *mho_pair_word(mho_pair_class kind);

/* Does a rule contradict the exact result? */
MHO_API bool mho_pair_disagrees(const mho_pair *pair, mho_rule_verdict rule);

MHO_END_DECLARATIONS

#endif
