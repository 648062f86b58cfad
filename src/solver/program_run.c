/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A compiled elimination over a batch of energies, and back.  For every pivot d
 * and pair (i, j) of its row a,
 *
 *   w = 1/d,   s' = s - a_i w a_j,
 *
 * rounds s' by at most u (3 |a_i w a_j| + |s'|), and ln T changes by adjoint(s')
 * times that (first order; S. Linnainmaa, BIT 16, 146 (1976)).  Going back, the
 * answer r_k of site k to each kept site (the kept sites' own: one and zero)
 * follows by substitution, r_k = -w sum_i a_i r_i.  The Schur complement is the
 * quadratic form of M on the answers, so at every stage of m
 *
 *   adjoint(m_ij) = r_i^T Q r_j,   adjoint(m_ii) = r_i^T Q r_i / 2
 *
 * with Q_cd the adjoint of the Schur complement's (c, d), twice that for c = d,
 * and for contacts of one site each adjoint(m_ij) = -2 Re (y_i z_j + z_i y_j) / g_LR,
 * y and z columns of G.  So |adjoint(m_ij)| <= <n_i, n_j>, a form of moduli: with n
 * = |r| that of |Q|, or with n = (|y|, |z|) (y_i z_j + z_i y_j) 2 / |g|, which
 * cannot be far too large where answers are large and cancel, next to levels of
 * the inner sites.  With R = sum_i |a_i| n_i
 * the products of a step cost at most 3/2 u |w| <R, R>, so no pair need be
 * visited.  Of the numbers themselves, rounded m times each,
 *
 *   |s_1| + .. + |s_m| <= m |s_m| + sum_l (l - 1) |a w a|_l:
 *
 * a product counts once more for every rounding before it, which its two members
 * share (so 3/2 R becomes a sum with weights), and a last value m times, which is
 * <R, n> of the step that eliminates it.
 */
#include "solver/program.h"
#include "base/processor.h"

#include <math.h>
#include <stddef.h>
#include <stdlib.h>
#include <sys/mman.h>

enum { L = PROGRAM_LANES, LARGE_PAGE = 1 << 21, UNROLLED = 3 };

/* All functions with vectors as values are inlined. */
#pragma GCC diagnostic ignored "-Wpsabi"

typedef mho_vector vector;
typedef mho_lanes lanes;
#define AT VECTOR_AT

mho_status mho_program_trace_create(const mho_program *program, mho_program_trace *trace)
{
  size_t slots = ((size_t)program->slots + 1) * L;
  size_t responses = 2 * slots * (size_t)program->kept;
  size_t bytes = (2 * slots + responses + program->taped * L) * sizeof(double);
  size_t page = bytes > LARGE_PAGE ? LARGE_PAGE : 64;
  trace->high = aligned_alloc(page, (bytes + page - 1) / page * page);
  if (!trace->high) return MHO_ERR_MEMORY;
#ifdef MADV_HUGEPAGE
  if (page == LARGE_PAGE) (void)madvise(trace->high, bytes, MADV_HUGEPAGE); /* only a hint */
#endif
  trace->low = trace->high + slots;
  trace->response = trace->low + slots;
  trace->tape = trace->response + responses;
  return MHO_OK;
}

void mho_program_trace_clear(mho_program_trace *trace)
{
  free(trace->high);
  *trace = (mho_program_trace){0};
}

INLINED void load_double(const mho_program_load *load, const double *energy_ev, double *high)
{
  double *s = high + (ptrdiff_t)load->slot * L;
  double weight = load->site >= 0 ? 1.0 : 0.0;
  EACH_VECTOR(v) AT(s, v) = weight * AT(energy_ev, v) - load->value;
}

/* One pivot; `row` is a constant where this is inlined for a short row. */
INLINED void eliminate(int row, int pivot, const int *slot, double *high, double *tape,
                       lanes *squares)
{
  const int *target = slot + 2 * row;
  lanes w, a[UNROLLED];
  EACH_VECTOR(v)
  {
    AT(tape, v) = w.of[v] = 1.0 / AT(high + (ptrdiff_t)pivot * L, v);
    squares->of[v] += w.of[v] * w.of[v];
  }
  for (int i = 0; i < row; i++)
    EACH_VECTOR(v)
    {
      vector entry = AT(high + (ptrdiff_t)slot[i] * L, v);
      AT(tape + (1 + i) * L, v) = entry;
      if (row <= UNROLLED) a[i].of[v] = entry;
    }
  for (int i = 0; i < row; i++) {
    lanes aw;
    EACH_VECTOR(v)
      aw.of[v] = w.of[v] * (row <= UNROLLED ? a[i].of[v] : AT(tape + (1 + i) * L, v));
    for (int j = i; j < row; j++, target++) {
      bool fresh = *target < 0;
      double *s = high + (ptrdiff_t)(fresh ? ~*target : *target) * L;
      EACH_VECTOR(v)
      {
        vector entry = row <= UNROLLED ? a[j].of[v] : AT(tape + (1 + j) * L, v);
        vector before = fresh ? (vector){0} : AT(s, v);
        AT(s, v) = before - aw.of[v] * entry;
      }
    }
  }
}

FOR_EVERY_PROCESSOR
void mho_program_forward_double(const mho_program *program, const double *energy_ev,
                                double norm_ev, mho_program_trace *trace)
{
  const mho_program_load *load = program->load;
  const int *slot = program->slot;
  double *high = trace->high, *tape = trace->tape;
  lanes squares = {{{0}}}; /* of all 1/d */
  for (size_t k = 0; k < program->steps; k++) {
    const mho_program_step *step = &program->step[k];
    int row = step->row;
    for (int i = 0; i < step->loads; i++) load_double(load++, energy_ev, high);
    switch (row) {
    case 1: eliminate(1, step->pivot, slot, high, tape, &squares); break;
    case 2: eliminate(2, step->pivot, slot, high, tape, &squares); break;
    case 3: eliminate(3, step->pivot, slot, high, tape, &squares); break;
    default: eliminate(row, step->pivot, slot, high, tape, &squares);
    }
    tape += (1 + row) * L;
    slot += 2 * row + row * (row + 1) / 2;
  }
  for (int i = 0; i < program->tail_loads; i++) load_double(load++, energy_ev, high);
  double most = 1 / (PIVOT_DOUBLE * norm_ev);
  for (int l = 0; l < L; l++) trace->broken[l] = !(squares.of[l / PROGRAM_VECTOR][l % PROGRAM_VECTOR] < most * most);
}

/* What the way back gathers of every lane. */
typedef struct {
  double form[PROGRAM_KEPT_MAX * PROGRAM_KEPT_MAX * L]; /* Q */
  double size[PROGRAM_KEPT_MAX * PROGRAM_KEPT_MAX * L]; /* |Q| */
  double total[L]; /* dlnT/dE: sum of the adjoints of the diagonal */
  double kappa[L], error[L];
} gathered;

/* |x + i y| up to an eighth more. */
INLINED vector modulus(vector x, vector y)
{
  vector a = ABSOLUTE(x), b = ABSOLUTE(y);
  mho_vector_bits larger = a > b;
  vector most = (vector)(((mho_vector_bits)a & larger) | ((mho_vector_bits)b & ~larger));
  vector least = (vector)(((mho_vector_bits)b & larger) | ((mho_vector_bits)a & ~larger));
  return most + 0.5 * least;
}

/* n of a site from its answer r. */
INLINED void measure(int kept, bool pair, const mho_program_trace *trace, int v,
                     const lanes *r, lanes *n)
{
  const mho_program_pair *p = &trace->pair;
  for (int c = 0; c < kept && !pair; c++) n[c].of[v] = ABSOLUTE(r[c].of[v]);
  if (!pair) return;
  vector left = r[0].of[v], right = r[1].of[v], b = AT(p->b, v);
  n[0].of[v] = modulus(left * AT(p->c_re, v) - right * b, left * p->c_im);
  n[1].of[v] = modulus(right * AT(p->a_re, v) - left * b, right * p->a_im);
}

/* <x, y> but for the weight of a pair. */
INLINED vector form(int kept, bool pair, const gathered *all, int v, const lanes *x,
                    const lanes *y)
{
  if (pair) return x[0].of[v] * y[1].of[v] + x[1].of[v] * y[0].of[v];
  vector sum = {0};
  for (int c = 0; c < kept; c++)
    for (int d = 0; d < kept; d++)
      sum += AT(all->size + (c * kept + d) * L, v) * x[c].of[v] * y[d].of[v];
  return sum;
}

/* The step's share of kappa, from r of its site. */
INLINED void weigh_step(int row, int kept, const int *diagonal, const mho_program_member *member,
                        const double *response, const lanes *r, gathered *all)
{
  lanes u[PROGRAM_KEPT_MAX];
  EACH_VECTOR(v)
  {
    vector hat = {0};
    for (int c = 0; c < kept; c++) {
      u[c].of[v] = AT(all->form + c * kept * L, v) * r[0].of[v];
      for (int d = 1; d < kept; d++)
        u[c].of[v] += AT(all->form + (c * kept + d) * L, v) * r[d].of[v];
      hat += u[c].of[v] * r[c].of[v];
    }
    AT(all->total, v) += 0.5 * hat;
    AT(all->kappa, v) += ABSOLUTE(hat) * (0.5 * fabs(member[0].value_ev));
  }
  for (int i = 0; i < row; i++) {
    double value_ev = fabs(member[1 + i].value_ev);
    const double *other = response + (ptrdiff_t)diagonal[i] * 2 * kept * L;
    if (value_ev == 0) continue;
    EACH_VECTOR(v)
    {
      vector hat = u[0].of[v] * AT(other, v);
      for (int c = 1; c < kept; c++) hat += u[c].of[v] * AT(other + c * L, v);
      AT(all->kappa, v) += ABSOLUTE(hat) * value_ev;
    }
  }
}

/* Back over one step: the answer of its site from those of its row.  `row`, `kept`
 * and `pair` are constants where this is inlined for the usual cases. */
INLINED void return_step(int row, int kept, bool pair, bool with_kappa,
                         const mho_program_step *step, const int *diagonal,
                         const mho_program_member *member, const double *tape,
                         mho_program_trace *trace, gathered *all)
{
  double *response = trace->response, *own = response + (ptrdiff_t)step->pivot * 2 * kept * L;
  lanes r[PROGRAM_KEPT_MAX], n[PROGRAM_KEPT_MAX];
  lanes size[PROGRAM_KEPT_MAX], weighted[PROGRAM_KEPT_MAX]; /* R */
  for (int c = 0; c < kept; c++) r[c] = size[c] = weighted[c] = (lanes){{{0}}};
  for (int i = 0; i < row; i++) {
    const double *other = response + (ptrdiff_t)diagonal[i] * 2 * kept * L;
    double weight = member[1 + i].weight;
    EACH_VECTOR(v)
    {
      vector a = AT(tape + (1 + i) * L, v), light = ABSOLUTE(a), heavy = light * weight;
      for (int c = 0; c < kept; c++) {
        vector moduli = AT(other + (kept + c) * L, v);
        r[c].of[v] -= a * AT(other + c * L, v);
        size[c].of[v] += light * moduli;
        weighted[c].of[v] += heavy * moduli;
      }
    }
  }
  EACH_VECTOR(v)
  {
    vector w = AT(tape, v);
    for (int c = 0; c < kept; c++) AT(own + c * L, v) = r[c].of[v] *= w;
    measure(kept, pair, trace, v, r, n);
    for (int c = 0; c < kept; c++) AT(own + (kept + c) * L, v) = n[c].of[v];
    AT(all->error, v) += ABSOLUTE(w) * form(kept, pair, all, v, weighted, size) +
                         member[0].weight * form(kept, pair, all, v, n, size);
  }
  if (with_kappa) weigh_step(row, kept, diagonal, member, response, r, all);
}

/* Q and the kept sites' answers to themselves alone. */
INLINED void start_back(int kept, bool pair, const mho_program *program,
                        const mho_program_trace *trace, gathered *all)
{
  *all = (gathered){.total = {0}};
  for (int a = 0; a < kept; a++) {
    double *own = trace->response + (size_t)program->kept_slot[a][a] * 2 * (size_t)kept * L;
    lanes r[PROGRAM_KEPT_MAX], n[PROGRAM_KEPT_MAX];
    EACH_VECTOR(v)
    {
      for (int b = 0; b < kept; b++)
        AT(own + b * L, v) = r[b].of[v] = (vector){0} + (a == b ? 1.0 : 0.0);
      measure(kept, pair, trace, v, r, n);
      for (int b = 0; b < kept; b++) AT(own + (kept + b) * L, v) = n[b].of[v];
    }
    for (int b = 0; b < kept; b++) {
      int at = program->kept_slot[a][b];
      const double *hat = trace->adjoint + (a < b ? b * kept + a : a * kept + b) * L;
      for (int l = 0; l < L; l++) {
        double q = at < 0 ? 0 : (a == b ? 2 : 1) * hat[l];
        all->form[(a * kept + b) * L + l] = q;
        all->size[(a * kept + b) * L + l] = fabs(q);
      }
    }
  }
}

/* What falls on the Schur complement itself, and the sums that make kappa. */
INLINED void finish_back(int kept, bool pair, const mho_program *program,
                         const double *energy_ev, double roundoff, mho_program_trace *trace,
                         gathered *all)
{
  for (int l = 0; l < L; l++) {
    double error = all->error[l] * (pair ? trace->pair.weight[l] : 1);
    for (int a = 0; a < kept; a++)
      for (int b = 0; b <= a; b++) {
        int at = program->kept_slot[a][b];
        if (at < 0) continue;
        double hat = trace->adjoint[(a * kept + b) * L + l];
        const mho_program_member *member = &program->kept_member[a][b];
        error += fabs(hat * trace->high[(size_t)at * L + (size_t)l]) * member->weight;
        all->kappa[l] += fabs(hat * member->value_ev);
        if (a == b) all->total[l] += hat;
      }
    trace->error[l] = roundoff * error;
    trace->kappa[l] = all->kappa[l] + fabs(all->total[l] * energy_ev[l]);
  }
}

INLINED void backward(int kept, bool pair, bool with_kappa, const mho_program *program,
                      const double *energy_ev, double roundoff, mho_program_trace *trace)
{
  const int *slot = program->slot + program->slots_listed;
  const mho_program_member *member = program->member + program->members;
  const double *tape = trace->tape + program->taped * L;
  gathered all;
  start_back(kept, pair, program, trace, &all);
  for (size_t k = program->steps; k-- > 0;) {
    const mho_program_step *step = &program->step[k];
    int row = step->row;
    slot -= 2 * row + row * (row + 1) / 2;
    tape -= (1 + row) * L;
    member -= 1 + row;
    const int *diagonal = slot + row;
#define RETURN_STEP(row)                                                       \
  return_step(row, kept, pair, with_kappa, step, diagonal, member, tape, trace, &all)
    switch (row) {
    case 1: RETURN_STEP(1); break;
    case 2: RETURN_STEP(2); break;
    case 3: RETURN_STEP(3); break;
    default: RETURN_STEP(row);
    }
#undef RETURN_STEP
  }
  finish_back(kept, pair, program, energy_ev, roundoff, trace, &all);
}

FOR_EVERY_PROCESSOR
void mho_program_backward(const mho_program *program, const double *energy_ev, bool pair,
                          double roundoff, bool with_kappa, mho_program_trace *trace)
{
  int kept = program->kept;
  if (pair && with_kappa) backward(2, true, true, program, energy_ev, roundoff, trace);
  else if (pair) backward(2, true, false, program, energy_ev, roundoff, trace);
  else backward(kept, false, with_kappa, program, energy_ev, roundoff, trace);
}
