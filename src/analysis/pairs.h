/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What the parts of the interference map share.
 */
#ifndef MHOLECULE_ANALYSIS_PAIRS_H
#define MHOLECULE_ANALYSIS_PAIRS_H

#include <mho/interference.h>

/* The hoppings that are not zero, as a graph. */
typedef struct {
  int count, *start, *next; /* neighbours of i: next[start[i]] ... */
  int *distance;            /* [count][count], -1: no path */
  bool two_coloured;        /* no odd ring; colour[i] is 0 or 1 */
  int *colour;              /* [count] */
} mho_pair_graph;

MHO_MUST_USE mho_status mho_pair_graph_build(const mho_junction *junction, mho_pair_graph *graph);
void mho_pair_graph_clear(mho_pair_graph *graph);

/* Magic integers of all pairs, where the molecule has them; magic.c. */
MHO_MUST_USE mho_status mho_pairs_magic(const mho_junction *junction, const mho_pair_graph *graph,
                                        mho_interference *map);

/* Rules of thumb of all pairs; rules.c. */
MHO_MUST_USE mho_status mho_pairs_rules(const mho_junction *junction, const mho_pair_graph *graph,
                                        mho_interference *map);

/* leader[pair]: the first of the pairs that symmetry makes equal; symmetry.c. */
MHO_MUST_USE mho_status mho_pairs_orbits(const mho_junction *junction,
                                         const mho_pair_graph *graph,
                                         const mho_interference *map, size_t *leader);

/* G = C diag(1/(E - level)) C^T into green[n*n]; work[n*n]. */
MHO_MUST_USE mho_status mho_bare_green(const mho_junction *junction, double energy_ev,
                                       double *work, double *green, mho_error *error);

/* Nodes and overturning shifts of the leaders; pair_nodes.c.  reference[pair] is
 * the |g| that a conducting pair is measured by. */
MHO_MUST_USE mho_status mho_pairs_nodes(const mho_junction *junction, double coupling_ev,
                                        const double *reference, const size_t *leader,
                                        mho_interference *map, mho_error *error);

/* A plan with one-site contacts of Gamma on two sites. */
MHO_MUST_USE mho_status mho_pair_plan(const mho_junction *junction, const int site[2],
                                      double coupling_ev, mho_plan **plan, mho_error *error);

#endif
