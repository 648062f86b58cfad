/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The levels of a molecule as its two contacts see them: equal ones as one.
 *
 *   g(E) = v_r^T (E - H)^-1 v_l = sum_k w_k / (E - eps_k).
 */
#ifndef MHOLECULE_SOLVER_LEVELS_H
#define MHOLECULE_SOLVER_LEVELS_H

#include <complex.h>

#include "solver/exact.h"

/* Levels this many roundings of ||H|| apart are one. */
#define SAME_LEVEL (64 * UNIT_ROUNDOFF)

typedef struct {
  double level_ev, weight;    /* w_k */
  double faint;               /* the zero's distance below a level of faint weight */
  double left, right, second; /* squared amplitudes at both contacts, and of what is
                               * left of the smaller without the direction of the other */
  int states; /* levels in it */
  int seen;   /* combinations of them that a contact sees; after settling */
} mho_level_group;

typedef struct {
  double complex value, slope; /* g, g' */
  double complex poles;        /* sum of 1/(z - eps) over levels of weight */
  double noise;                /* what g may be wrong by */
} mho_level_sum;

/* Groups by ascending level into group[sites]; returns how many. */
int mho_levels_group(const mho_plan *plan, mho_level_group *group);

/* Finds which states are seen and which weights are zero: by the exact counts,
 * amplitudes below 1e-13 being none, and a weight being none where that moves
 * no zero.  False where it cannot be told.  room[2 sites]. */
bool mho_levels_settle(mho_level_group *group, int count, const mho_exact_counts *exact,
                       double scale_ev, double *room);

mho_level_sum mho_levels_sum(const mho_level_group *group, int count, double scale_ev,
                             double complex z);

#endif
