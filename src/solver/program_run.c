/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A compiled elimination over a batch of energies, and back.  For every pivot d
 * and pair (i, j) of its row a,
 *
 *   w = -1/d,   s' = s + a_i w a_j,
 *
 * in double-double after T. J. Dekker, Numer. Math. 18, 224 (1971), with products by
 * fused multiply-add; bounds of such operations are in M. Joldes, J.-M. Muller and
 * V. Popescu, ACM Trans. Math. Softw. 44, 15 (2017).  With u = 2^-53 and every number
 * normalised, w errs by at most 8 u^2, a_i w by 8 u^2 and (a_i w) a_j by 12 u^2 of
 * their moduli, the sum by u^2 (4 |s'| + 21 |a_i w a_j|), cancellation included: in
 * all by less than
 *
 *   UNIT (6.5 |a_i w a_j| + |s'|),   UNIT = 8 u^2 = 2^-103.
 *
 * ln T changes by adjoint(s') times that, to first order (S. Linnainmaa, BIT 16, 146
 * (1976)).  Going back, the answer r_k of site k to each kept site (the kept sites'
 * own: one and zero) follows by substitution, r_k = w sum_i a_i r_i.  The Schur
 * complement is the quadratic form of M on the answers, so at every stage of m
 *
 *   adjoint(m_ij) = r_i^T Q r_j,   adjoint(m_ii) = r_i^T Q r_i / 2
 *
 * with Q_cd the adjoint of the Schur complement's (c, d), twice that for c = d.
 * Moduli bound it: with R = sum_i |a_i| |r_i|, and <x, y> the form of |Q|, the products
 * of a step weigh |w| <R, R> / 2, so no pair need be visited.  Of a number rounded
 * m times, as none is more than `roundings`,
 *
 *   |s_1| + .. + |s_m| <= m (|s_m| + sum_l |a w a|_l),
 *
 * and the last values weigh <R, r> and d <r, r> / 2 in the step that eliminates them:
 * with |r| <= |w| R, 3/2 |w| <R, R>.  Next to levels of the inner sites the answers
 * are large and cancel, and this is too large by the square of the inverse distance;
 * between 2^-103 and the contract is room for both.
 */
#include "base/processor.h"
#include "solver/program.h"

#include <math.h>
#include <stddef.h>
#include <stdlib.h>
#include <sys/mman.h>

enum { LARGE_PAGE = 1 << 21, UNROLLED = PROGRAM_BARE_ROW };

/* A pivot below PIVOT (times the norm) leaves too few digits for first order. */
#define PIVOT 1e-12

#define UNIT 0x1p-103

/* All functions with vectors as values are inlined. */
#pragma GCC diagnostic ignored "-Wpsabi"

/* Lanes in a register, loaded and stored by their address; L lanes run.  A step is done
 * for one vector after the other, which are independent and overlap. */
enum { VECTOR = 8, VECTORS = PROGRAM_LANES / VECTOR };
#define OF_LANES __attribute__((vector_size(VECTOR * sizeof(double)), aligned(8), may_alias))
typedef double vector OF_LANES;
typedef long long bits OF_LANES;
typedef struct {
  vector of[VECTORS];
} lanes;
typedef struct {
  vector high, low;
} pair;
#define EACH_VECTOR(v) for (int v = 0; v < L / VECTOR; v++)
#define AT(array, v) (*(vector *)((array) + (v) * VECTOR))
#define ABSOLUTE(x) ((vector)((bits)(x) & ((bits){0} + 0x7fffffffffffffffLL)))

mho_status mho_program_trace_create(const mho_program *program, mho_program_trace *trace)
{
  size_t run = (size_t)program->lanes, slots = ((size_t)program->slots + 1) * run;
  size_t responses = slots * (size_t)program->kept;
  size_t bytes = (2 * slots + responses + program->taped * run) * sizeof(double);
  size_t page = bytes > LARGE_PAGE ? LARGE_PAGE : 64;
  trace->number = aligned_alloc(page, (bytes + page - 1) / page * page);
  if (!trace->number) return MHO_ERR_MEMORY;
#ifdef MADV_HUGEPAGE
  if (page == LARGE_PAGE) (void)madvise(trace->number, bytes, MADV_HUGEPAGE); /* only a hint */
#endif
  trace->response = trace->number + 2 * slots;
  trace->tape = trace->response + responses;
  return MHO_OK;
}

void mho_program_trace_clear(mho_program_trace *trace)
{
  free(trace->number);
  *trace = (mho_program_trace){0};
}

/* --- double-double ------------------------------------------------------------------ */

/* Compiler vectors have no fused multiply-add of their own; of a loop over
 * elements it makes one. */
INLINED vector fused(vector a, vector b, vector c)
{
  vector result;
  for (int k = 0; k < VECTOR; k++) result[k] = __builtin_fma(a[k], b[k], c[k]);
  return result;
}

INLINED vector splat(double value)
{
  return (vector){0} + value;
}

INLINED pair pair_at(int L, const double *number, int v)
{
  return (pair){AT(number, v), AT(number + L, v)};
}

/* high + low once more as the nearest double and a rest; |low| <= |high|. */
INLINED void store_normal(int L, vector high, vector low, double *number, int v)
{
  vector sum = high + low;
  AT(number, v) = sum;
  AT(number + L, v) = low - (sum - high);
}

INLINED pair product(pair a, pair b)
{
  vector high = a.high * b.high, rest = fused(a.high, b.high, -high);
  return (pair){high, fused(a.low, b.high, fused(a.high, b.low, rest))};
}

/* a b for a of one double. */
INLINED pair times(vector a, pair b)
{
  vector high = a * b.high;
  return (pair){high, fused(a, b.low, fused(a, b.high, -high))};
}

/* -1/d by a Newton step. */
INLINED pair inverse(pair d)
{
  vector first = -1.0 / d.high, rest = fused(d.high, first, splat(1.0));
  return (pair){first, first * fused(d.low, first, rest)};
}

/* x + y exactly: D. E. Knuth's two-sum. */
INLINED pair sum_of(vector x, vector y)
{
  vector sum = x + y, part = sum - x;
  return (pair){sum, (x - (sum - part)) + (y - part)};
}

/* s + p */
INLINED void add(int L, pair p, double *s, int v)
{
  pair sum = sum_of(AT(s, v), p.high);
  store_normal(L, sum.high, sum.low + (AT(s + L, v) + p.low), s, v);
}

/* E - value; most sites have none. */
INLINED pair diagonal_value(const double *energy_ev, double value_ev, int v)
{
  if (value_ev == 0) return (pair){AT(energy_ev, v), splat(0)};
  return sum_of(AT(energy_ev, v), splat(-value_ev));
}

/* --- forward ------------------------------------------------------------------------ */

INLINED void load(int L, const mho_program_step *step, const mho_program_load *next,
                  const double *energy_ev, mho_program_trace *trace)
{
  for (int k = 0; k < step->diagonals; k++, next++) {
    double *s = PROGRAM_NUMBER(trace, next->slot);
    EACH_VECTOR(v)
    {
      pair d = diagonal_value(energy_ev, next->value_ev, v);
      AT(s, v) = d.high;
      AT(s + L, v) = d.low;
    }
  }
  for (int k = 0; k < step->bonds; k++, next++) {
    double *s = PROGRAM_NUMBER(trace, next->slot);
    EACH_VECTOR(v)
    {
      AT(s, v) = splat(-next->value_ev);
      AT(s + L, v) = splat(0);
    }
  }
}

/* The target of a pair, p more. */
INLINED void update(int L, pair p, int target, int v, mho_program_trace *trace)
{
  if (target < 0) store_normal(L, p.high, p.low, PROGRAM_NUMBER(trace, ~target), v);
  else add(L, p, PROGRAM_NUMBER(trace, target), v);
}

/* One pivot, one vector of lanes; `row` is a constant where this is inlined for a
 * short row, whose numbers then stay in registers. */
INLINED void eliminate(int L, int row, int pivot, const int *slot, double *tape, int v,
                       vector *squares, mho_program_trace *trace)
{
  const int *target = slot + 2 * row;
  pair w = inverse(pair_at(L, PROGRAM_NUMBER(trace, pivot), v)), a[UNROLLED];
  AT(tape, v) = w.high;
  *squares = fused(w.high, w.high, *squares);
#pragma GCC unroll 3
  for (int i = 0; i < row; i++) {
    pair entry = pair_at(L, PROGRAM_NUMBER(trace, slot[i]), v);
    AT(tape + (1 + i) * L, v) = entry.high;
    if (row <= UNROLLED) a[i] = entry;
  }
#pragma GCC unroll 3
  for (int i = 0; i < row; i++) {
    pair aw = product(row <= UNROLLED ? a[i] : pair_at(L, PROGRAM_NUMBER(trace, slot[i]), v), w);
#pragma GCC unroll 3
    for (int j = i; j < row; j++) {
      pair other = row <= UNROLLED ? a[j] : pair_at(L, PROGRAM_NUMBER(trace, slot[j]), v);
      update(L, product(aw, other), *target++, v, trace);
    }
  }
}

/* The same where pivot and row are bare[1 + row]; their signs cancel. */
INLINED void eliminate_bare(int L, int row, const mho_program_load *bare, const int *slot,
                            const double *energy_ev, int v, vector *squares,
                            mho_program_trace *trace)
{
  const int *target = slot + row;
  pair w = inverse(diagonal_value(energy_ev, bare[0].value_ev, v));
  *squares = fused(w.high, w.high, *squares);
#pragma GCC unroll 3
  for (int i = 0; i < row; i++) {
    pair aw = times(splat(bare[1 + i].value_ev), w);
#pragma GCC unroll 3
    for (int j = i; j < row; j++)
      update(L, times(splat(bare[1 + j].value_ev), aw), *target++, v, trace);
  }
}

FOR_EVERY_PROCESSOR
void mho_program_forward(const mho_program *program, const double *energy_ev, size_t count,
                         double norm_ev, mho_program_trace *trace)
{
  const mho_program_load *next = program->load;
  const int *slot = program->slot;
  double *tape = trace->tape;
  const int L = trace->lanes = count <= VECTOR ? VECTOR : program->lanes;
  lanes squares = {{{0}}}; /* of all 1/d */
  for (size_t k = 0; k < program->steps; k++) {
    const mho_program_step *step = &program->step[k];
    const mho_program_load *bare = next;
    int row = step->row, pairs = row * (row + 1) / 2;
    if (step->pivot == PROGRAM_BARE) next += 1 + row;
    load(L, step, next, energy_ev, trace);
    next += step->diagonals + step->bonds;
    if (step->pivot == PROGRAM_BARE) {
#define ELIMINATE(row)                                                               \
  EACH_VECTOR(v) eliminate_bare(L, row, bare, slot, energy_ev, v, &squares.of[v], trace)
      switch (row) {
      case 1: ELIMINATE(1); break;
      case 2: ELIMINATE(2); break;
      case 3: ELIMINATE(3); break;
      }
#undef ELIMINATE
      slot += row + pairs;
      continue;
    }
#define ELIMINATE(row)                                                               \
  EACH_VECTOR(v) eliminate(L, row, step->pivot, slot, tape, v, &squares.of[v], trace)
    switch (row) {
    case 1: ELIMINATE(1); break;
    case 2: ELIMINATE(2); break;
    case 3: ELIMINATE(3); break;
    default: ELIMINATE(row);
    }
#undef ELIMINATE
    tape += (1 + row) * L;
    slot += 2 * row + pairs;
  }
  load(L, &program->last, next, energy_ev, trace);
  double most = 1 / (PIVOT * norm_ev);
  for (int l = 0; l < L; l++)
    trace->broken[l] = !(squares.of[l / VECTOR][l % VECTOR] < most * most);
}

/* --- and back ----------------------------------------------------------------------- */

/* <x, x>; size[kept][kept][lanes] is |Q|. */
INLINED vector form(int L, int kept, const double *size, int v, const vector *x)
{
  vector sum = {0};
  for (int c = 0; c < kept; c++) {
    vector part = 0.5 * AT(size + (c * kept + c) * L, v) * x[c];
    for (int d = 0; d < c; d++) part += AT(size + (c * kept + d) * L, v) * x[d];
    sum += part * x[c];
  }
  return 2 * sum;
}

/* Back over one step, one vector of lanes: the answer of its site from those of its
 * row.  `row` and `kept` are constants where this is inlined for the usual cases. */
INLINED void return_step(int L, int row, int kept, int pivot, const int *diagonal,
                         const double *tape, const double *size, double *response, int v,
                         vector *error)
{
  double *own = response + (ptrdiff_t)pivot * kept * L;
  vector answer[PROGRAM_KEPT_MAX], moduli[PROGRAM_KEPT_MAX]; /* r / w, R */
  for (int c = 0; c < kept; c++) answer[c] = moduli[c] = splat(0);
#pragma GCC unroll 3
  for (int i = 0; i < row; i++) {
    const double *other = response + (ptrdiff_t)diagonal[i] * kept * L;
    vector entry = AT(tape + (1 + i) * L, v);
    for (int c = 0; c < kept; c++) {
      vector part = entry * AT(other + c * L, v);
      answer[c] += part;
      moduli[c] += ABSOLUTE(part);
    }
  }
  vector w = AT(tape, v);
  for (int c = 0; c < kept; c++) AT(own + c * L, v) = w * answer[c];
  *error += ABSOLUTE(w) * form(L, kept, size, v, moduli);
}

/* The same for a bare step, whose answer nobody needs. */
INLINED void return_bare(int L, int row, int kept, const mho_program_load *bare,
                         const int *diagonal, const double *energy_ev, const double *size,
                         const double *response, int v, vector *error)
{
  vector moduli[PROGRAM_KEPT_MAX];
  for (int c = 0; c < kept; c++) moduli[c] = splat(0);
#pragma GCC unroll 3
  for (int i = 0; i < row; i++) {
    const double *other = response + (ptrdiff_t)diagonal[i] * kept * L;
    double light = fabs(bare[1 + i].value_ev);
    for (int c = 0; c < kept; c++) moduli[c] += light * ABSOLUTE(AT(other + c * L, v));
  }
  vector w = 1.0 / (AT(energy_ev, v) - bare[0].value_ev);
  *error += ABSOLUTE(w) * form(L, kept, size, v, moduli);
}

/* |Q|, and the kept sites' answers. */
INLINED void start_back(int L, int kept, const mho_program *program, mho_program_trace *trace,
                        double *size)
{
  for (int a = 0; a < kept; a++)
    for (int b = 0; b < kept; b++) {
      double *own = trace->response + ((ptrdiff_t)program->kept_slot[a][a] * kept + b) * L;
      const double *hat = trace->adjoint + (a < b ? b * kept + a : a * kept + b) * PROGRAM_LANES;
      bool zero = program->kept_slot[a][b] < 0;
      for (int l = 0; l < L; l++) {
        own[l] = a == b;
        size[(a * kept + b) * L + l] = zero ? 0 : (a == b ? 2 : 1) * fabs(hat[l]);
      }
    }
}

/* Adds what falls on the Schur complement itself. */
INLINED void finish_back(int L, int kept, const mho_program *program, const lanes *error,
                         mho_program_trace *trace)
{
  double most = program->roundings;
  for (int l = 0; l < L; l++)
    trace->error[l] = (3.25 + 2 * most) * error->of[l / VECTOR][l % VECTOR];
  for (int a = 0; a < kept; a++)
    for (int b = 0; b <= a; b++) {
      int slot = program->kept_slot[a][b];
      for (int l = 0; slot >= 0 && l < L; l++)
        trace->error[l] += most * fabs(trace->adjoint[(a * kept + b) * PROGRAM_LANES + l] *
                                       PROGRAM_NUMBER(trace, slot)[l]);
    }
  for (int l = 0; l < L; l++) trace->error[l] *= UNIT;
}

INLINED void backward(int kept, const mho_program *program, const double *energy_ev,
                      mho_program_trace *trace)
{
  const int *slot = program->slot + program->slots_listed;
  const mho_program_load *bare = program->load + program->loads;
  double size[PROGRAM_KEPT_MAX * PROGRAM_KEPT_MAX * PROGRAM_LANES];
  const int L = trace->lanes;
  const double *tape = trace->tape + program->taped * (size_t)L;
  lanes error = {{{0}}};
  bare -= program->last.diagonals + program->last.bonds;
  start_back(L, kept, program, trace, size);
  for (size_t k = program->steps; k-- > 0;) {
    const mho_program_step *step = &program->step[k];
    int row = step->row;
    slot -= row * (row + 1) / 2 + row; /* at the diagonals */
    bare -= step->diagonals + step->bonds;
    if (step->pivot == PROGRAM_BARE) {
      bare -= 1 + row;
#define RETURN_STEP(row)                                                             \
  EACH_VECTOR(v) return_bare(L, row, kept, bare, slot, energy_ev, size, trace->response, v, \
                             &error.of[v])
      switch (row) {
      case 1: RETURN_STEP(1); break;
      case 2: RETURN_STEP(2); break;
      case 3: RETURN_STEP(3); break;
      }
#undef RETURN_STEP
      continue;
    }
    tape -= (1 + row) * L;
#define RETURN_STEP(row)                                                             \
  EACH_VECTOR(v) return_step(L, row, kept, step->pivot, slot, tape, size, trace->response, v, \
                             &error.of[v])
    switch (row) {
    case 1: RETURN_STEP(1); break;
    case 2: RETURN_STEP(2); break;
    case 3: RETURN_STEP(3); break;
    default: RETURN_STEP(row);
    }
#undef RETURN_STEP
    slot -= row;
  }
  finish_back(L, kept, program, &error, trace);
}

FOR_EVERY_PROCESSOR
void mho_program_backward(const mho_program *program, const double *energy_ev,
                          mho_program_trace *trace)
{
  if (program->kept == 2) backward(2, program, energy_ev, trace);
  else backward(program->kept, program, energy_ev, trace);
}
