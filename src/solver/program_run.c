/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Runs a compiled elimination over a batch of energies.  For every pivot d and
 * pair (a, b) of its row
 *
 *   w = 1/d,   s' = s - a w b,
 *   error' = error + |w b| error_a + |a w| error_b + |a w^2 b| error_d + rounding,
 *
 * the first-order bound of N. J. Higham, Accuracy and Stability of Numerical
 * Algorithms, section 3.3; pivots with less than half their digits are refused,
 * so that first order is enough.  Double-double after T. J. Dekker, Numer.
 * Math. 18, 224 (1971), its products by fused multiply-add.
 */
#include "solver/program.h"
#include "solver/processor.h"

#include <math.h>
#include <stdlib.h>

enum { L = PROGRAM_LANES };

/* Roundoff of a double, and of a double-double operation (at most 6 2^-106 for
 * those below: M. Joldes, J.-M. Muller and V. Popescu, ACM Trans. Math. Softw.
 * 44, 15 (2017)). */
#define U UNIT_ROUNDOFF
#define UU 0x1p-103

/* A pivot whose relative error exceeds this is refused. */
#define PIVOT_ERROR 1e-6

mho_status mho_program_numbers_create(const mho_program *program, mho_program_numbers *numbers)
{
  size_t room = ((size_t)program->slots + 1) * L;
  *numbers = (mho_program_numbers){0};
  numbers->high = aligned_alloc(64, 3 * room * sizeof(double));
  if (!numbers->high) return MHO_ERR_MEMORY;
  numbers->low = numbers->high + room;
  numbers->error = numbers->low + room;
  return MHO_OK;
}

void mho_program_numbers_clear(mho_program_numbers *numbers)
{
  free(numbers->high);
  *numbers = (mho_program_numbers){0};
}

static inline void load_double(const mho_program_load *load, const double *energy_ev,
                               mho_program_numbers *n)
{
  double *s = n->high + (size_t)load->slot * L, *e = n->error + (size_t)load->slot * L;
  double value = load->value;
  bool diagonal = load->site >= 0;
#pragma GCC ivdep
  for (int l = 0; l < L; l++) {
    s[l] = diagonal ? energy_ev[l] - value : -value;
    e[l] = diagonal ? U * fabs(s[l]) : 0.0;
  }
}

static inline void update_double(const double *a, const double *a_error, const double *b,
                                 const double *b_error, const double *w, const double *w_error,
                                 double *s, double *e, bool fresh)
{
#pragma GCC ivdep
  for (int l = 0; l < L; l++) {
    double aw = a[l] * w[l], product = aw * b[l];
    double before = fresh ? 0.0 : s[l], error = fresh ? 0.0 : e[l];
    double after = before - product;
    error += fabs(w[l] * b[l]) * a_error[l] + fabs(aw) * b_error[l] +
             fabs(product) * (w_error[l] + 3 * U) + U * fabs(after);
    s[l] = after;
    e[l] = error;
  }
}

FOR_EVERY_PROCESSOR
void mho_program_run_double(const mho_program *program, const double *energy_ev,
                            mho_program_numbers *n)
{
  const mho_program_load *load = program->load;
  const int *slot = program->slot;
  double worst[L] = {0};
  for (size_t k = 0; k < program->steps; k++) {
    const mho_program_step *step = &program->step[k];
    for (int i = 0; i < step->loads; i++) load_double(load++, energy_ev, n);
    const double *d = n->high + (size_t)step->pivot * L, *d_error = n->error + (size_t)step->pivot * L;
    double w[L], w_error[L];
#pragma GCC ivdep
  for (int l = 0; l < L; l++) {
      w[l] = 1.0 / d[l];
      w_error[l] = fabs(w[l]) * d_error[l];
      worst[l] = worst[l] > w_error[l] ? worst[l] : w_error[l]; /* NaN stays in s */
    }
    const int *target = slot + step->row;
    for (int i = 0; i < step->row; i++)
      for (int j = i; j < step->row; j++, target++) {
        size_t a = (size_t)slot[i] * L, b = (size_t)slot[j] * L;
        bool fresh = *target < 0;
        size_t s = (size_t)(fresh ? ~*target : *target) * L;
        update_double(n->high + a, n->error + a, n->high + b, n->error + b, w, w_error,
                      n->high + s, n->error + s, fresh);
      }
    slot = target;
  }
  for (int i = 0; i < program->tail_loads; i++) load_double(load++, energy_ev, n);
#pragma GCC ivdep
  for (int l = 0; l < L; l++) n->broken[l] = !(worst[l] < PIVOT_ERROR);
}

static inline void load_extended(const mho_program_load *load, const double *energy_ev,
                                 mho_program_numbers *n)
{
  size_t at = (size_t)load->slot * L;
  double value = load->value;
  bool diagonal = load->site >= 0;
#pragma GCC ivdep
  for (int l = 0; l < L; l++) { /* E - value exactly: D. E. Knuth's two-sum */
    double first = diagonal ? energy_ev[l] : 0.0, sum = first - value, part = sum - first;
    n->high[at + (size_t)l] = sum;
    n->low[at + (size_t)l] = (first - (sum - part)) - (value + part);
    n->error[at + (size_t)l] = 0.0;
  }
}

/* (high, low) of the product of two double-doubles. */
#define MULTIPLY(ph, pl, ah, al, bh, bl)                                       \
  double ph = (ah) * (bh);                                                     \
  double pl = __builtin_fma((ah), (bh), -ph) + ((ah) * (bl) + (al) * (bh))

static inline void update_extended(const mho_program_numbers *n, size_t a, size_t b,
                                   const double *wh, const double *wl, const double *w_error,
                                   size_t s, bool fresh)
{
  const double *ah = n->high + a, *al = n->low + a, *ae = n->error + a;
  const double *bh = n->high + b, *bl = n->low + b, *be = n->error + b;
  double *sh = n->high + s, *sl = n->low + s, *se = n->error + s;
#pragma GCC ivdep
  for (int l = 0; l < L; l++) {
    MULTIPLY(th, tl, ah[l], al[l], wh[l], wl[l]);
    MULTIPLY(ph, pl, th, tl, bh[l], bl[l]);
    double before = fresh ? 0.0 : sh[l], before_low = fresh ? 0.0 : sl[l];
    double error = fresh ? 0.0 : se[l];
    double sum = before - ph, part = sum - before;
    double rest = (before - (sum - part)) - (ph + part);
    rest += before_low - pl;
    double high = sum + rest, low = rest - (high - sum);
    error += fabs(wh[l] * bh[l]) * ae[l] + fabs(th) * be[l] + fabs(ph) * (w_error[l] + UU) +
             UU * (fabs(before) + fabs(ph));
    sh[l] = high;
    sl[l] = low;
    se[l] = error;
  }
}

FOR_EVERY_PROCESSOR
void mho_program_run_extended(const mho_program *program, const double *energy_ev,
                              mho_program_numbers *n)
{
  const mho_program_load *load = program->load;
  const int *slot = program->slot;
  double worst[L] = {0};
  for (size_t k = 0; k < program->steps; k++) {
    const mho_program_step *step = &program->step[k];
    for (int i = 0; i < step->loads; i++) load_extended(load++, energy_ev, n);
    size_t d = (size_t)step->pivot * L;
    double wh[L], wl[L], w_error[L];
#pragma GCC ivdep
  for (int l = 0; l < L; l++) { /* a Newton step from 1/d; 1 - d w is nearly exact */
      double dh = n->high[d + (size_t)l], dl = n->low[d + (size_t)l], w = 1.0 / dh;
      double residual = __builtin_fma(-dh, w, 1.0) - dl * w;
      double low = w * residual;
      wh[l] = w + low;
      wl[l] = low - (wh[l] - w);
      w_error[l] = fabs(w) * n->error[d + (size_t)l] + UU;
      worst[l] = worst[l] > w_error[l] ? worst[l] : w_error[l];
    }
    const int *target = slot + step->row;
    for (int i = 0; i < step->row; i++)
      for (int j = i; j < step->row; j++, target++) {
        bool fresh = *target < 0;
        update_extended(n, (size_t)slot[i] * L, (size_t)slot[j] * L, wh, wl, w_error,
                        (size_t)(fresh ? ~*target : *target) * L, fresh);
      }
    slot = target;
  }
  for (int i = 0; i < program->tail_loads; i++) load_extended(load++, energy_ev, n);
#pragma GCC ivdep
  for (int l = 0; l < L; l++) n->broken[l] = !(worst[l] < PIVOT_ERROR);
}
