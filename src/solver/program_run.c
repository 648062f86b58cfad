/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A compiled elimination over a batch of energies, and back.  For every pivot d
 * and pair (a, b) of its row
 *
 *   w = 1/d,   s' = s - a w b;
 *   rounding of s' <= u (3 |a w b| + |s'|),
 *
 * and ln T changes by adjoint(s') times that (first order; S. Linnainmaa, BIT
 * 16, 146 (1976)).  Adjoints go back by
 *
 *   a^ -= w b s^,   b^ -= w a s^,   d^ += a w^2 b s^.
 *
 * Double-double after T. J. Dekker, Numer. Math. 18, 224 (1971), its products
 * by fused multiply-add.
 */
#include "solver/program.h"
#include "solver/processor.h"

#include <math.h>
#include <stdlib.h>
#include <sys/mman.h>

enum { L = PROGRAM_LANES, LARGE_PAGE = 1 << 21 };

/* Pivots below this (times the norm) leave too few digits for first order. */
#define PIVOT_DOUBLE 1e-6
#define PIVOT_EXTENDED 1e-12

mho_status mho_program_trace_create(const mho_program *program, mho_program_trace *trace)
{
  size_t slots = ((size_t)program->slots + 1) * L;
  size_t bytes = (3 * slots + program->taped * L) * sizeof(double);
  size_t page = bytes > LARGE_PAGE ? LARGE_PAGE : 64;
  *trace = (mho_program_trace){0};
  trace->high = aligned_alloc(page, (bytes + page - 1) / page * page);
  if (!trace->high) return MHO_ERR_MEMORY;
#ifdef MADV_HUGEPAGE
  if (page == LARGE_PAGE) (void)madvise(trace->high, bytes, MADV_HUGEPAGE); /* only a hint */
#endif
  trace->low = trace->high + slots;
  trace->adjoint = trace->low + slots;
  trace->tape = trace->adjoint + slots;
  for (size_t k = 0; k < slots; k++) trace->adjoint[k] = 0;
  return MHO_OK;
}

void mho_program_trace_clear(mho_program_trace *trace)
{
  free(trace->high);
  *trace = (mho_program_trace){0};
}

static inline void load_double(const mho_program_load *load, const double *energy_ev,
                               double *high)
{
  double *restrict s = high + (size_t)load->slot * L;
  double value = load->value;
  if (load->site >= 0)
    for (int l = 0; l < L; l++) s[l] = energy_ev[l] - value;
  else
    for (int l = 0; l < L; l++) s[l] = -value;
}

static inline void keep(double *restrict tape, const double *restrict value)
{
  for (int l = 0; l < L; l++) tape[l] = value[l];
}

FOR_EVERY_PROCESSOR
void mho_program_forward_double(const mho_program *program, const double *energy_ev,
                                double norm_ev, mho_program_trace *trace)
{
  const mho_program_load *load = program->load;
  const int *slot = program->slot;
  double *high = trace->high, *tape = trace->tape, smallest[L];
  for (int l = 0; l < L; l++) smallest[l] = INFINITY;
  for (size_t k = 0; k < program->steps; k++) {
    const mho_program_step *step = &program->step[k];
    for (int i = 0; i < step->loads; i++) load_double(load++, energy_ev, high);
    const double *d = high + (size_t)step->pivot * L;
    double *w = tape;
    for (int l = 0; l < L; l++) {
      double size = fabs(d[l]);
      smallest[l] = smallest[l] < size ? smallest[l] : size;
      w[l] = 1.0 / d[l];
    }
    tape += L;
    const int *target = slot + step->row;
    for (int i = 0; i < step->row; i++, tape += L) keep(tape, high + (size_t)slot[i] * L);
    for (int i = 0; i < step->row; i++) {
      const double *restrict a = high + (size_t)slot[i] * L;
      double aw[L];
      for (int l = 0; l < L; l++) aw[l] = a[l] * w[l];
      for (int j = i; j < step->row; j++, target++, tape += L) {
        const double *restrict b = high + (size_t)slot[j] * L;
        bool fresh = *target < 0;
        double *restrict s = high + (size_t)(fresh ? ~*target : *target) * L;
        double *restrict kept = tape;
        if (fresh)
          for (int l = 0; l < L; l++) kept[l] = s[l] = -(aw[l] * b[l]);
        else
          for (int l = 0; l < L; l++) kept[l] = s[l] = s[l] - aw[l] * b[l];
      }
    }
    slot = target;
  }
  for (int i = 0; i < program->tail_loads; i++) load_double(load++, energy_ev, high);
  for (int l = 0; l < L; l++) trace->broken[l] = !(smallest[l] > PIVOT_DOUBLE * norm_ev);
}

static inline void load_extended(const mho_program_load *load, const double *energy_ev,
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

static inline void update_extended(const mho_program_trace *trace, size_t b,
                                   const double *restrict th, const double *restrict tl,
                                   size_t s, double keep_old, double *restrict kept)
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
    kept[l] = high;
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
    const int *target = slot + step->row;
    for (int i = 0; i < step->row; i++, tape += L) keep(tape, high + (size_t)slot[i] * L);
    for (int i = 0; i < step->row; i++) {
      const double *restrict ah = high + (size_t)slot[i] * L, *restrict al = low + (size_t)slot[i] * L;
      double th[L], tl[L];
      for (int l = 0; l < L; l++) {
        MULTIPLY(ph, pl, ah[l], al[l], w[l], w_low[l]);
        th[l] = ph;
        tl[l] = pl;
      }
      for (int j = i; j < step->row; j++, target++, tape += L) {
        bool fresh = *target < 0;
        update_extended(trace, (size_t)slot[j] * L, th, tl,
                        (size_t)(fresh ? ~*target : *target) * L, fresh ? 0.0 : 1.0, tape);
      }
    }
    slot = target;
  }
  for (int i = 0; i < program->tail_loads; i++) load_extended(load++, energy_ev, trace);
  for (int l = 0; l < L; l++) trace->broken[l] = !(smallest[l] > PIVOT_EXTENDED * norm_ev);
}

/* A number's birth: its share of kappa, and its slot's adjoint is free again. */
static inline void unload(const mho_program_load *load, const double *restrict energy_ev,
                          double roundoff, double *restrict adjoint, double *restrict total,
                          double *restrict kappa, double *restrict error)
{
  double value = fabs(load->value);
  bool diagonal = load->site >= 0;
  for (int l = 0; l < L; l++) {
    double size = fabs(adjoint[l]);
    kappa[l] += size * value;
    if (diagonal) {
      total[l] += adjoint[l];
      error[l] += roundoff * size * (fabs(energy_ev[l]) + value);
    }
    adjoint[l] = 0;
  }
}

/* One pair going back; a and b may be one. */
static inline void return_pair(const double *a, const double *b, const double *w,
                               const double *after, double roundoff, bool fresh, double *s_hat,
                               double *a_hat, double *b_hat, double *restrict d_hat,
                               double *restrict error)
{
#pragma GCC ivdep
  for (int l = 0; l < L; l++) {
    double s = s_hat[l], wb = w[l] * b[l], wa = w[l] * a[l], product = wa * b[l];
    error[l] += roundoff * fabs(s) * (3 * fabs(product) + fabs(after[l]));
    d_hat[l] += s * product * w[l];
    double to_a = s * wb, to_b = s * wa;
    if (a_hat == b_hat) a_hat[l] -= to_a + to_b;
    else {
      a_hat[l] -= to_a;
      b_hat[l] -= to_b;
    }
    s_hat[l] = fresh ? 0.0 : s;
  }
}

FOR_EVERY_PROCESSOR
void mho_program_backward(const mho_program *program, const double *energy_ev,
                          double roundoff, mho_program_trace *trace)
{
  const mho_program_load *load = program->load + program->loads;
  const int *slot = program->slot + program->slots_listed;
  const double *tape = trace->tape + program->taped * L;
  double *hat = trace->adjoint, total[L] = {0}, kappa[L] = {0}, error[L] = {0};
  for (int i = 0; i < program->tail_loads; i++, load--)
    unload(load - 1, energy_ev, roundoff, hat + (size_t)load[-1].slot * L, total, kappa, error);
  for (size_t k = program->steps; k-- > 0;) {
    const mho_program_step *step = &program->step[k];
    int m = step->row, pairs = m * (m + 1) / 2;
    const int *target = slot - pairs, *row = target - m;
    const double *after = tape - (size_t)pairs * L, *value = after - (size_t)m * L, *w = value - L;
    double d_hat[L] = {0};
    for (int i = 0, p = 0; i < m; i++)
      for (int j = i; j < m; j++, p++) {
        bool fresh = target[p] < 0;
        size_t s = (size_t)(fresh ? ~target[p] : target[p]) * L;
        return_pair(value + (size_t)i * L, value + (size_t)j * L, w, after + (size_t)p * L,
                    roundoff, fresh, hat + s, hat + (size_t)row[i] * L, hat + (size_t)row[j] * L,
                    d_hat, error);
      }
    double *pivot_hat = hat + (size_t)step->pivot * L;
    for (int l = 0; l < L; l++) pivot_hat[l] = d_hat[l];
    for (int i = 0; i < step->loads; i++, load--)
      unload(load - 1, energy_ev, roundoff, hat + (size_t)load[-1].slot * L, total, kappa, error);
    slot = row;
    tape = w;
  }
  for (int l = 0; l < L; l++) {
    trace->kappa[l] = kappa[l] + fabs(total[l] * energy_ev[l]);
    trace->error[l] = error[l];
  }
}
