/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Elimination of a sparse H compiled once: every site that no contact touches
 * is eliminated in a fixed order, in real double-double arithmetic, for many
 * energies at a time, without pivoting.  What is left is the Schur complement on
 * the contacts' sites.  Going back over the program bounds the error of ln T.
 */
#ifndef MHOLECULE_SOLVER_PROGRAM_H
#define MHOLECULE_SOLVER_PROGRAM_H

#include <stddef.h>

#include "solver/plan.h"

/* Lanes at most, and where at most so many energies wait. */
enum { PROGRAM_LANES = 32, PROGRAM_FEW = 8 };

enum { PROGRAM_KEPT_MAX = 8, PROGRAM_BARE = -1, PROGRAM_BARE_ROW = 3 };

/* A number of H that comes alive: E - value on the diagonal, else -value. */
typedef struct {
  int slot;
  double value_ev;
} mho_program_load;

/* One pivot: loads first; then row / d; then all pairs of the row.  Where pivot and
 * row are still those of H (bare), they stand before the loads and have no slots;
 * no other step asks for this site's answer, and nothing is taped. */
typedef struct {
  int diagonals, bonds; /* numbers of loads, in this order */
  int row, pivot;       /* number of row entries; slot of d, or PROGRAM_BARE */
} mho_program_step;

struct mho_program {
  mho_program_step *step, last; /* last: only the loads that no pivot asked for */
  size_t steps;
  mho_program_load *load;
  size_t loads;
  int *slot; /* a step's row, the diagonals of the row's sites, then a target for
              * each pair; ~slot: new */
  size_t slots_listed;
  int slots;     /* numbers alive at once */
  int roundings; /* of a number, at most */
  int kept;      /* sites of the contacts */
  int kept_site[PROGRAM_KEPT_MAX];
  int kept_slot[PROGRAM_KEPT_MAX][PROGRAM_KEPT_MAX]; /* -1: zero */
  size_t taped; /* numbers a lane puts on the tape */
  int lanes;    /* to run at a time */
};

/* *program is NULL where elimination in sparse form does not pay.
 * Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_program_create(const mho_plan *plan, mho_program **program);
void mho_program_free(mho_program *program);

/* A batch of energies in work: number[slots][high, low][lanes]; a site's answers
 * stand at the slot of its diagonal, response[slots][kept][lanes]; adjoint holds
 * dlnT/dS of the Schur complement's entries, [kept][kept][PROGRAM_LANES], an entry and its
 * mirror being one number that stands at [a][b] for b <= a; the tape keeps what the
 * way back needs: of a step -1/d and the row. */
typedef struct {
  double *number, *response, *tape;
  int lanes; /* that run, and that all but adjoint, broken and error have room for */
  double adjoint[PROGRAM_KEPT_MAX * PROGRAM_KEPT_MAX * PROGRAM_LANES];
  bool broken[PROGRAM_LANES];  /* a pivot was too small for a bound of first order */
  double error[PROGRAM_LANES]; /* of ln T, from rounding in the elimination */
} mho_program_trace;

/* High parts of a number's lanes; the low parts stand trace->lanes further on. */
#define PROGRAM_NUMBER(trace, slot) ((trace)->number + (ptrdiff_t)(slot) * 2 * (trace)->lanes)

/* All zero is a trace without room; create makes room.  Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_program_trace_create(const mho_program *program,
                                                 mho_program_trace *trace);
void mho_program_trace_clear(mho_program_trace *trace);

/* Eliminates at energy_ev[PROGRAM_LANES], of which the first count <= program->lanes
 * matter; the kept slots then hold the Schur complement.  norm_ev is that of H. */
void mho_program_forward(const mho_program *program, const double *energy_ev, size_t count,
                         double norm_ev, mho_program_trace *trace);

/* From the adjoints of the Schur complement to the error. */
void mho_program_backward(const mho_program *program, const double *energy_ev,
                          mho_program_trace *trace);

/* Both for vectors of so many energies; program_lanes.inc. */
#define PROGRAM_OF_WIDTH(width)                                                          \
  void mho_program_forward_##width(const mho_program *program, const double *energy_ev,  \
                                   size_t count, double norm_ev, mho_program_trace *trace); \
  void mho_program_backward_##width(const mho_program *program, const double *energy_ev, \
                                    mho_program_trace *trace);
PROGRAM_OF_WIDTH(2)
PROGRAM_OF_WIDTH(4)
PROGRAM_OF_WIDTH(8)
#undef PROGRAM_OF_WIDTH

/* For contacts of one site each: T and the relative error of this last step at
 * every lane, adjoints set.  NaN or an infinite error where T is zero. */
bool mho_program_is_pair(const mho_plan *plan);
void mho_program_finish_pair(const mho_plan *plan, mho_program_trace *trace,
                             double *transmission, double *relative_error);

#endif
