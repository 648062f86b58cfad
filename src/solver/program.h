/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Elimination of a sparse H compiled once: every site that no contact touches
 * is eliminated in a fixed order, in real arithmetic, for many energies at a
 * time, without pivoting but with a running bound on every number's error.
 * What is left is the Schur complement on the contacts' sites.
 */
#ifndef MHOLECULE_SOLVER_PROGRAM_H
#define MHOLECULE_SOLVER_PROGRAM_H

#include "solver/plan.h"

enum { PROGRAM_LANES = 16, PROGRAM_KEPT_MAX = 8 };

typedef struct {
  int slot, site; /* site >= 0: E - value, the diagonal; else -value */
  double value;
} mho_program_load;

/* One pivot: loads first; then row / d; then all pairs of the row. */
typedef struct {
  int loads, row, pivot; /* numbers of loads and of row entries; slot of d */
} mho_program_step;

struct mho_program {
  mho_program_step *step;
  size_t steps;
  mho_program_load *load;
  size_t loads;
  int *slot; /* a step's row slots, then a target for each pair; ~slot: new */
  size_t slots_listed;
  int slots; /* numbers alive at once */
  int kept;  /* sites of the contacts */
  int kept_site[PROGRAM_KEPT_MAX];
  int kept_slot[PROGRAM_KEPT_MAX][PROGRAM_KEPT_MAX];
  int tail_loads; /* that no pivot asked for */
};

/* *program is NULL where elimination in sparse form does not pay.
 * Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_program_create(const mho_plan *plan, mho_program **program);
void mho_program_free(mho_program *program);

/* Numbers of a batch of energies, each [slots][lanes]: value = high + low, and
 * a bound on its error.  broken[lane] where a pivot drowns in its error. */
typedef struct {
  double *high, *low, *error;
  bool broken[PROGRAM_LANES];
} mho_program_numbers;

MHO_MUST_USE mho_status mho_program_numbers_create(const mho_program *program,
                                                   mho_program_numbers *numbers);
void mho_program_numbers_clear(mho_program_numbers *numbers);

/* Runs the program at energy_ev[PROGRAM_LANES], in double or in double-double. */
void mho_program_run_double(const mho_program *program, const double *energy_ev,
                            mho_program_numbers *numbers);
void mho_program_run_extended(const mho_program *program, const double *energy_ev,
                              mho_program_numbers *numbers);

#endif
