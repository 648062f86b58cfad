/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The elimination of program_run.c in double-double after T. J. Dekker, Numer.
 * Math. 18, 224 (1971), products by fused multiply-add.  The way back is the same:
 * it wants the leading parts only.  Compiled without contraction, which would
 * spoil what makes the low parts exact.
 */
#include "solver/program.h"
#include "solver/processor.h"

#include <math.h>

enum { L = PROGRAM_LANES };

INLINED void keep(double *restrict tape, const double *restrict value)
{
  for (int l = 0; l < L; l++) tape[l] = value[l];
}

INLINED void load_extended(const mho_program_load *load, const double *energy_ev,
                           mho_program_trace *trace)
{
  double *restrict high = trace->high + (size_t)load->slot * L;
  double *restrict low = trace->low + (size_t)load->slot * L;
  double value = load->value, weight = load->site >= 0 ? 1.0 : 0.0;
  for (int l = 0; l < L; l++) { /* E - value exactly: D. E. Knuth's two-sum */
    double first = weight * energy_ev[l], sum = first - value, part = sum - first;
    high[l] = sum;
    low[l] = (first - (sum - part)) - (value + part);
  }
}

/* (high, low) of the product of two double-doubles. */
#define MULTIPLY(ph, pl, ah, al, bh, bl)                                       \
  double ph = (ah) * (bh);                                                     \
  double pl = __builtin_fma((ah), (bh), -ph) + ((ah) * (bl) + (al) * (bh))

INLINED void update_extended(const mho_program_trace *trace, size_t b,
                             const double *restrict th, const double *restrict tl,
                             size_t s, double keep_old)
{
  const double *restrict bh = trace->high + b, *restrict bl = trace->low + b;
  double *restrict sh = trace->high + s, *restrict sl = trace->low + s;
  for (int l = 0; l < L; l++) {
    MULTIPLY(ph, pl, th[l], tl[l], bh[l], bl[l]);
    double before = keep_old != 0 ? sh[l] : 0.0, before_low = keep_old != 0 ? sl[l] : 0.0;
    double sum = before - ph, part = sum - before;
    double rest = (before - (sum - part)) - (ph + part);
    rest += before_low - pl;
    double high = sum + rest;
    sl[l] = rest - (high - sum);
    sh[l] = high;
  }
}

FOR_EVERY_PROCESSOR
void mho_program_forward_extended(const mho_program *program, const double *energy_ev,
                                  double norm_ev, mho_program_trace *trace)
{
  const mho_program_load *load = program->load;
  const int *slot = program->slot;
  double *high = trace->high, *low = trace->low, *tape = trace->tape, smallest[L];
  for (int l = 0; l < L; l++) smallest[l] = INFINITY;
  for (size_t k = 0; k < program->steps; k++) {
    const mho_program_step *step = &program->step[k];
    for (int i = 0; i < step->loads; i++) load_extended(load++, energy_ev, trace);
    const double *dh = high + (size_t)step->pivot * L, *dl = low + (size_t)step->pivot * L;
    double *restrict w = tape, w_low[L];
    for (int l = 0; l < L; l++) { /* a Newton step from 1/d; 1 - d w is nearly exact */
      double size = fabs(dh[l]), first = 1.0 / dh[l];
      double rest = first * (__builtin_fma(-dh[l], first, 1.0) - dl[l] * first);
      smallest[l] = smallest[l] < size ? smallest[l] : size;
      w[l] = first + rest;
      w_low[l] = rest - (w[l] - first);
    }
    tape += L;
    const int *target = slot + 2 * step->row;
    for (int i = 0; i < step->row; i++, tape += L) keep(tape, high + (size_t)slot[i] * L);
    for (int i = 0; i < step->row; i++) {
      const double *restrict ah = high + (size_t)slot[i] * L, *restrict al = low + (size_t)slot[i] * L;
      double th[L], tl[L];
      for (int l = 0; l < L; l++) {
        MULTIPLY(ph, pl, ah[l], al[l], w[l], w_low[l]);
        th[l] = ph;
        tl[l] = pl;
      }
      for (int j = i; j < step->row; j++, target++) {
        bool fresh = *target < 0;
        update_extended(trace, (size_t)slot[j] * L, th, tl,
                        (size_t)(fresh ? ~*target : *target) * L, fresh ? 0.0 : 1.0);
      }
    }
    slot = target;
  }
  for (int i = 0; i < program->tail_loads; i++) load_extended(load++, energy_ev, trace);
  for (int l = 0; l < L; l++) trace->broken[l] = !(smallest[l] > PIVOT_EXTENDED * norm_ev);
}
