/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Where to draw the atoms of a molecule: bonds of length 1 in a plane.
 */
#ifndef MHOLECULE_MOLECULE_LAYOUT_H
#define MHOLECULE_MOLECULE_LAYOUT_H

#include <mho/status.h>

/* Largest graph that is laid out by its rings and chains; a larger one is
 * drawn on a circle. */
enum { MHO_LAYOUT_LIMIT = 2000 };

typedef enum {
  MHO_LAYOUT_RINGS,  /* regular rings and chains */
  MHO_LAYOUT_STRESS, /* distances in the plane follow those in the graph */
  MHO_LAYOUT_CIRCLE  /* given up */
} mho_layout_kind;

typedef struct {
  int points, bonds;
  const int (*bond)[2]; /* [bonds] no point with itself */
  const int *order;     /* [bonds]: a triple or two double bonds are straight; or NULL */
} mho_layout_graph;

/* Fills position[points] and what became of it (kind may be NULL).  The work
 * is bounded for any graph: about 1e7 steps.  Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_layout(const mho_layout_graph *graph,
                                   double (*position)[2],
                                   mho_layout_kind *kind);

#endif
