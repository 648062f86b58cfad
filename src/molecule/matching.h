/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Maximum matching on a general graph.
 */
#ifndef MHOLECULE_MOLECULE_MATCHING_H
#define MHOLECULE_MOLECULE_MATCHING_H

#include <mho/status.h>

/* A simple graph: the neighbours of v are next[start[v]] ... */
typedef struct {
  int count;
  const int *start; /* [count + 1] */
  const int *next;
} mho_match_graph;

/* Enlarges a matching (mate[v], -1 where v is free) to a maximum one.
 * With `missed` NULL it stops at the first vertex that must stay free.
 * Otherwise missed[v] becomes true where some maximum matching leaves v free
 * (the set D of Gallai and Edmonds).  Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_match_maximum(const mho_match_graph *graph,
                                          int *mate, bool *missed);

#endif
