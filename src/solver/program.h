/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Elimination of a sparse H compiled once: every site that no contact touches
 * is eliminated in a fixed order, in real arithmetic, for many energies at a
 * time, without pivoting.  What is left is the Schur complement on the contacts'
 * sites.  Going back over the program gives the answers of all sites to them, and
 * with these a bound on the error of ln T and, if wanted, its condition.
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

/* A number of a row: H, zero where it is fill, and how its roundings weigh in
 * the bound (program_run.c). */
typedef struct {
  double value_ev, weight;
} mho_program_member;

struct mho_program {
  mho_program_step *step;
  size_t steps;
  mho_program_load *load;
  size_t loads;
  int *slot; /* a step's row, the diagonals of the row's sites, then a target for
              * each pair; ~slot: new */
  size_t slots_listed;
  mho_program_member *member; /* of a step: its site, then its row */
  size_t members;
  int slots; /* numbers alive at once */
  int kept;  /* sites of the contacts */
  int kept_site[PROGRAM_KEPT_MAX];
  int kept_slot[PROGRAM_KEPT_MAX][PROGRAM_KEPT_MAX];
  mho_program_member kept_member[PROGRAM_KEPT_MAX][PROGRAM_KEPT_MAX];
  int tail_loads; /* that no pivot asked for */
  size_t taped;   /* numbers a lane puts on the tape */
};

/* *program is NULL where elimination in sparse form does not pay.
 * Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_program_create(const mho_plan *plan, mho_program **program);
void mho_program_free(mho_program *program);

/* For contacts of one site each, what bounds the adjoints by |G_iL| |G_jR|:
 * [[a, b], [b, c]] with Sigma, and 2 / |b D|; program_pair.c. */
typedef struct {
  double a_re[PROGRAM_LANES], b[PROGRAM_LANES], c_re[PROGRAM_LANES], weight[PROGRAM_LANES];
  double a_im, c_im;
} mho_program_pair;

/* A batch of energies in work.  value = high + low of every slot; adjoint holds
 * dlnT/dS of the Schur complement's entries, [kept][kept][lanes], an entry and
 * its mirror being one number that stands at [a][b] for b <= a; a site's answer r
 * and its moduli stand at the slot of its diagonal, [slots][2][kept][lanes]; the tape
 * keeps what the way back needs: of a step 1/d and the row. */
typedef struct {
  double *high, *low, *response, *tape;
  double adjoint[PROGRAM_KEPT_MAX * PROGRAM_KEPT_MAX * PROGRAM_LANES];
  mho_program_pair pair; /* if the plan is one of a pair */
  bool broken[PROGRAM_LANES];   /* a pivot was too small for these digits */
  double kappa[PROGRAM_LANES];  /* sum of |p dlnT/dp| over H and E, if asked for */
  double error[PROGRAM_LANES];  /* of ln T, from rounding in the elimination */
} mho_program_trace;

/* All zero is a trace without room; create makes room.  Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_program_trace_create(const mho_program *program,
                                                 mho_program_trace *trace);
void mho_program_trace_clear(mho_program_trace *trace);

/* Eliminates at energy_ev[PROGRAM_LANES], in double or in double-double; the
 * kept slots then hold the Schur complement.  norm_ev is that of H. */
void mho_program_forward_double(const mho_program *program, const double *energy_ev,
                                double norm_ev, mho_program_trace *trace);
void mho_program_forward_extended(const mho_program *program, const double *energy_ev,
                                  double norm_ev, mho_program_trace *trace);

/* From the adjoints of the Schur complement to the error and, if asked for,
 * kappa; roundoff is that of the numbers' subtraction.  `pair`: trace->pair is set. */
void mho_program_backward(const mho_program *program, const double *energy_ev, bool pair,
                          double roundoff, bool with_kappa, mho_program_trace *trace);

/* For contacts of one site each: T and the relative error of this last step at
 * every lane, adjoints set.  NaN or an infinite error where T is zero. */
bool mho_program_is_pair(const mho_plan *plan);
void mho_program_finish_pair(const mho_plan *plan, bool extended, mho_program_trace *trace,
                             double *transmission, double *relative_error);

/* Roundoff of double, and of the double-double operations used: at most 6 2^-106
 * (M. Joldes, J.-M. Muller and V. Popescu, ACM Trans. Math. Softw. 44, 15 (2017)). */
#define ROUNDOFF_DOUBLE UNIT_ROUNDOFF
#define ROUNDOFF_EXTENDED 0x1p-103

/* A pivot below PIVOT (times the norm) leaves too few digits for first order. */
#define PIVOT_DOUBLE 1e-6
#define PIVOT_EXTENDED 1e-12

/* Lanes in a register, loaded and stored by their address; and all lanes of a
 * number, kept in registers where loops over VECTORS are innermost. */
enum { PROGRAM_VECTOR = 8, PROGRAM_VECTORS = PROGRAM_LANES / PROGRAM_VECTOR };
typedef double mho_vector
    __attribute__((vector_size(PROGRAM_VECTOR * sizeof(double)), aligned(8), may_alias));
typedef long long mho_vector_bits
    __attribute__((vector_size(PROGRAM_VECTOR * sizeof(double)), aligned(8), may_alias));
typedef struct {
  mho_vector of[PROGRAM_VECTORS];
} mho_lanes;
#define EACH_VECTOR(v) for (int v = 0; v < PROGRAM_VECTORS; v++)
#define VECTOR_AT(array, v) (*(mho_vector *)((array) + (v) * PROGRAM_VECTOR))
#define ABSOLUTE(x) ((mho_vector)((mho_vector_bits)(x) & ((mho_vector_bits){0} + 0x7fffffffffffffffLL)))

#endif
