/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Small rings of a plain graph, and its distances.
 */
#ifndef MHOLECULE_MOLECULE_RINGS_H
#define MHOLECULE_MOLECULE_RINGS_H

#include "molecule/layout.h"

/* Neighbours of v: next[start[v]] ... next[start[v + 1] - 1], each once. */
typedef struct {
  int points;
  int *start, *next;
} mho_neighbours;

MHO_MUST_USE mho_status mho_neighbours_make(const mho_layout_graph *graph,
                                            mho_neighbours *neighbours);
void mho_neighbours_clear(mho_neighbours *neighbours);

typedef struct {
  int count;
  int *start; /* [count + 1] into point */
  int *point; /* of each ring in its order */
} mho_ring_list;

/* The shortest cycle through every bond that lies in one, each once: not all
 * rings of a smallest basis, but every atom and bond of one.  Stops searching
 * after `work` steps and says so in *complete.  Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_rings_find(const mho_neighbours *neighbours,
                                       long work, mho_ring_list *rings,
                                       bool *complete);
void mho_rings_clear(mho_ring_list *rings);

/* Places the `count` points listed in `member` so that distances in the plane
 * follow those in the graph (bonds and angles most), within the part of the
 * graph that they form.  Stress majorization: E. R. Gansner, Y. Koren,
 * S. North, Lect. Notes Comput. Sci. 3383, 239 (2004).  O(count^2) a round.
 * Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_stress_place(const mho_neighbours *neighbours,
                                         const int *member, int count,
                                         const mho_ring_list *rings,
                                         double (*position)[2]);

#endif
