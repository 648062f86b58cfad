/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The elimination of program_run.c in double-double after T. J. Dekker, Numer.
 * Math. 18, 224 (1971), products by fused multiply-add.  The way back is the same:
 * it wants the leading parts only.
 */
#include "solver/program.h"
#include "base/processor.h"

#include <math.h>
#include <stddef.h>

enum { L = PROGRAM_LANES };

#pragma GCC diagnostic ignored "-Wpsabi"

typedef mho_vector vector;
typedef mho_lanes lanes;
#define AT VECTOR_AT

/* Compiler vectors have no fused multiply-add of their own; of a loop over
 * elements it makes one. */
INLINED void fused(const vector *a, const vector *b, const vector *c, vector *result)
{
  for (int k = 0; k < PROGRAM_VECTOR; k++)
    (*result)[k] = __builtin_fma((*a)[k], (*b)[k], (*c)[k]);
}

typedef struct {
  vector high, low;
} pair;

INLINED pair pair_at(const mho_program_trace *trace, int slot, int v)
{
  return (pair){AT(trace->high + (ptrdiff_t)slot * L, v), AT(trace->low + (ptrdiff_t)slot * L, v)};
}

INLINED void product(const pair *a, const pair *b, pair *p)
{
  vector high = a->high * b->high, minus = -high, rest;
  fused(&a->high, &b->high, &minus, &rest);
  *p = (pair){high, rest + (a->high * b->low + a->low * b->high)};
}

/* s - p */
INLINED void difference(const pair *s, const pair *p, pair *result)
{
  vector sum = s->high - p->high, part = sum - s->high;
  vector rest = (s->high - (sum - part)) - (p->high + part);
  rest += s->low - p->low;
  result->high = sum + rest;
  result->low = rest - (result->high - sum);
}

/* 1/d by a Newton step; 1 - d w is nearly exact. */
INLINED void inverse(const pair *d, pair *w)
{
  vector first = 1.0 / d->high, minus = -d->high, one = (vector){0} + 1.0, rest;
  fused(&minus, &first, &one, &rest);
  rest = first * (rest - d->low * first);
  w->high = first + rest;
  w->low = rest - (w->high - first);
}

/* E - value exactly: D. E. Knuth's two-sum. */
INLINED void load_extended(const mho_program_load *load, const double *energy_ev,
                           mho_program_trace *trace)
{
  double *high = trace->high + (ptrdiff_t)load->slot * L, *low = trace->low + (ptrdiff_t)load->slot * L;
  double value = load->value, weight = load->site >= 0 ? 1.0 : 0.0;
  EACH_VECTOR(v)
  {
    vector first = weight * AT(energy_ev, v), sum = first - value, part = sum - first;
    AT(high, v) = sum;
    AT(low, v) = (first - (sum - part)) - (value + part);
  }
}

/* One pivot; `row` is a constant where this is inlined for a short row. */
INLINED void eliminate(int row, int pivot, const int *slot, double *tape, lanes *squares,
                       mho_program_trace *trace)
{
  const int *target = slot + 2 * row;
  pair w[PROGRAM_VECTORS];
  EACH_VECTOR(v)
  {
    pair d = pair_at(trace, pivot, v);
    inverse(&d, &w[v]);
    AT(tape, v) = w[v].high;
    squares->of[v] += w[v].high * w[v].high;
  }
  for (int i = 0; i < row; i++)
    EACH_VECTOR(v) AT(tape + (1 + i) * L, v) = AT(trace->high + (ptrdiff_t)slot[i] * L, v);
  for (int i = 0; i < row; i++) {
    pair aw[PROGRAM_VECTORS];
    EACH_VECTOR(v)
    {
      pair a = pair_at(trace, slot[i], v);
      product(&a, &w[v], &aw[v]);
    }
    for (int j = i; j < row; j++, target++) {
      bool fresh = *target < 0;
      int to = fresh ? ~*target : *target;
      EACH_VECTOR(v)
      {
        pair a = pair_at(trace, slot[j], v), before = {{0}, {0}}, p;
        if (!fresh) before = pair_at(trace, to, v);
        product(&aw[v], &a, &p);
        difference(&before, &p, &before);
        AT(trace->high + (ptrdiff_t)to * L, v) = before.high;
        AT(trace->low + (ptrdiff_t)to * L, v) = before.low;
      }
    }
  }
}

FOR_EVERY_PROCESSOR
void mho_program_forward_extended(const mho_program *program, const double *energy_ev,
                                  double norm_ev, mho_program_trace *trace)
{
  const mho_program_load *load = program->load;
  const int *slot = program->slot;
  double *tape = trace->tape;
  lanes squares = {{{0}}}; /* of all 1/d */
  for (size_t k = 0; k < program->steps; k++) {
    const mho_program_step *step = &program->step[k];
    int row = step->row;
    for (int i = 0; i < step->loads; i++) load_extended(load++, energy_ev, trace);
    switch (row) {
    case 1: eliminate(1, step->pivot, slot, tape, &squares, trace); break;
    case 2: eliminate(2, step->pivot, slot, tape, &squares, trace); break;
    case 3: eliminate(3, step->pivot, slot, tape, &squares, trace); break;
    default: eliminate(row, step->pivot, slot, tape, &squares, trace);
    }
    tape += (1 + row) * L;
    slot += 2 * row + row * (row + 1) / 2;
  }
  for (int i = 0; i < program->tail_loads; i++) load_extended(load++, energy_ev, trace);
  double most = 1 / (PIVOT_EXTENDED * norm_ev);
  for (int l = 0; l < L; l++)
    trace->broken[l] = !(squares.of[l / PROGRAM_VECTOR][l % PROGRAM_VECTOR] < most * most);
}
