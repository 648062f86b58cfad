/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * E - H reduced to the sites of the contacts, for many molecules of one pattern
 * or many energies of one molecule at a time: sparse elimination without
 * pivoting, in an order fixed once.  Every number has a slot of its own, so that
 * the rows of eliminated sites stand there for the way back.  For work that
 * checks its own result; program.h has bounds.
 */
#ifndef MHOLECULE_SOLVER_REDUCTION_H
#define MHOLECULE_SOLVER_REDUCTION_H

#include "solver/plan.h"

/* Lanes, and those of a half where at most so many are wanted. */
enum { REDUCTION_LANES = 32, REDUCTION_FEW = 8 };

enum { REDUCTION_KEPT_MAX = 8 };

/* A pivot, which is the diagonal of its site. */
typedef struct {
  int site, row;
} mho_reduction_step;

typedef struct {
  int sites, slots, kept; /* slots 0 .. sites - 1 are the diagonals */
  int kept_site[REDUCTION_KEPT_MAX];
  int kept_slot[REDUCTION_KEPT_MAX][REDUCTION_KEPT_MAX]; /* -1: zero */
  mho_plan *contacts; /* of the kept sites alone */
  bool pair;          /* contacts of one site each, two of them */
  int steps;
  mho_reduction_step *step;
  int *list;          /* of a step: slots of its row, their sites, a slot for each pair of them */
  int (*between)[2];  /* [slots] the two sites of a number */
  double *value_ev;   /* [slots] H; 0 where elimination fills in */
} mho_reduction;

/* NULL where it does not pay: contacts of many sites, no sparse pattern, chains
 * as electrodes, contacts that no path joins.  Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_reduction_create(const mho_plan *plan, mho_reduction **reduction);
void mho_reduction_free(mho_reduction *reduction);

/* Slot of the number between two sites, or -1. */
int mho_reduction_find(const mho_reduction *reduction, int i, int j);

/* Eliminates in place number[slots][REDUCTION_LANES], E - H_ii and -H_ij, at the
 * first `lanes` of both halves of the lanes; largest_inverse[lanes] is that of the
 * pivots. */
void mho_reduction_run(const mho_reduction *reduction, int lanes, double *number,
                       double *largest_inverse);

/* The same for vectors of so many; reduction_lanes.inc. */
#define REDUCTION_OF_WIDTH(width)                                                     \
  void mho_reduction_run_##width(const mho_reduction *reduction, int lanes,           \
                                 double *number, double *largest_inverse);
REDUCTION_OF_WIDTH(2)
REDUCTION_OF_WIDTH(4)
REDUCTION_OF_WIDTH(8)
#undef REDUCTION_OF_WIDTH

#endif
