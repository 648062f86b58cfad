/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A compiled elimination over a batch of energies, and back.  For every pivot d
 * and pair (a, b) of its row
 *
 *   w = 1/d,   s' = s - a w b;
 *   rounding of s' <= u (3 |a w b| + |s'|),
 *
 * and ln T changes by adjoint(s') times that (first order; S. Linnainmaa, BIT
 * 16, 146 (1976)).  Going back, the answer r_i of site i to each kept site (the
 * kept sites' own: one and zero) follows by substitution, r_i = -w sum_j a_j r_j.
 * The Schur complement is the quadratic form of M on the answers, so
 *
 *   adjoint(m_ij) = r_i^T Q r_j,   adjoint(m_ii) = r_i^T Q r_i / 2
 *
 * at every stage of m, with Q_cd the adjoint of the Schur complement's (c, d),
 * twice that for c = d.  The way back restores the numbers by s = s' + a w b;
 * only the error bound looks at them.
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

/* Lanes in a register, loaded and stored by their address. */
enum { V = 8 };
typedef double vector __attribute__((vector_size(V * sizeof(double)), aligned(8), may_alias));
typedef long long bits __attribute__((vector_size(V * sizeof(double)), aligned(8), may_alias));
#define AT(array, l) (*(vector *)((array) + (l)))
#define ABSOLUTE(x) ((vector)((bits)(x) & ((bits){0} + 0x7fffffffffffffffLL)))

mho_status mho_program_trace_create(const mho_program *program, mho_program_trace *trace)
{
  size_t slots = ((size_t)program->slots + 1) * L;
  size_t responses = 2 * slots * (size_t)program->kept;
  size_t bytes = (3 * slots + responses + program->taped * L) * sizeof(double);
  size_t page = bytes > LARGE_PAGE ? LARGE_PAGE : 64;
  *trace = (mho_program_trace){0};
  trace->high = aligned_alloc(page, (bytes + page - 1) / page * page);
  if (!trace->high) return MHO_ERR_MEMORY;
#ifdef MADV_HUGEPAGE
  if (page == LARGE_PAGE) (void)madvise(trace->high, bytes, MADV_HUGEPAGE); /* only a hint */
#endif
  trace->low = trace->high + slots;
  trace->adjoint = trace->low + slots;
  trace->response = trace->adjoint + slots;
  trace->tape = trace->response + responses;
  for (size_t k = 0; k < slots; k++) trace->adjoint[k] = 0; /* of lanes that found no T */
  return MHO_OK;
}

void mho_program_trace_clear(mho_program_trace *trace)
{
  free(trace->high);
  *trace = (mho_program_trace){0};
}

INLINED void keep(double *restrict tape, const double *restrict value)
{
  for (int l = 0; l < L; l++) tape[l] = value[l];
}

INLINED void load_double(const mho_program_load *load, double *energy_ev, double *high)
{
  double *s = high + (size_t)load->slot * L;
  double weight = load->site >= 0 ? 1.0 : 0.0;
  for (int l = 0; l < L; l += V) AT(s, l) = weight * AT(energy_ev, l) - load->value;
}

FOR_EVERY_PROCESSOR
void mho_program_forward_double(const mho_program *program, const double *at_ev,
                                double norm_ev, mho_program_trace *trace)
{
  const mho_program_load *load = program->load;
  const int *slot = program->slot;
  double *high = trace->high, *tape = trace->tape, largest[L] = {0}, energy_ev[L];
  keep(energy_ev, at_ev);
  for (size_t k = 0; k < program->steps; k++) {
    const mho_program_step *step = &program->step[k];
    for (int i = 0; i < step->loads; i++) load_double(load++, energy_ev, high);
    for (int l = 0; l < L; l += V) {
      double *lane = high + l, *taped = tape + l;
      const int *target = slot + step->row;
      vector d = AT(lane, (size_t)step->pivot * L), w = 1.0 / d;
      vector before = AT(largest, l), size = ABSOLUTE(w);
      bits larger = size > before;
      AT(largest, l) = (vector)(((bits)size & larger) | ((bits)before & ~larger));
      AT(taped, 0) = w;
      AT(taped, L) = d;
      for (int i = 0; i < step->row; i++) {
        vector a = AT(lane, (size_t)slot[i] * L), aw = a * w;
        AT(taped, (2 + i) * L) = a;
        for (int j = i; j < step->row; j++, target++) {
          vector product = aw * AT(lane, (size_t)slot[j] * L);
          if (*target < 0) AT(lane, (size_t)~*target * L) = -product;
          else AT(lane, (size_t)*target * L) -= product;
        }
      }
    }
    tape += (2 + step->row) * L;
    slot += step->row + step->row * (step->row + 1) / 2;
  }
  for (int i = 0; i < program->tail_loads; i++) load_double(load++, energy_ev, high);
  for (int l = 0; l < L; l++) trace->broken[l] = !(largest[l] * PIVOT_DOUBLE * norm_ev < 1.0);
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
    keep(tape + L, dh);
    tape += 2 * L;
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

/* A number's birth: its share of kappa. */
INLINED void unload(const mho_program_load *load, double *energy_ev, double *adjoint,
                    double *total, double *kappa, double *error)
{
  double value = fabs(load->value);
  for (int l = 0; l < L; l += V) {
    vector hat = AT(adjoint, l), size = ABSOLUTE(hat);
    AT(kappa, l) += size * value;
    if (load->site < 0) continue;
    AT(total, l) += hat;
    AT(error, l) += size * (ABSOLUTE(AT(energy_ev, l)) + value);
  }
}

/* Back over one step: the answer of its site from those of its row, then all pairs,
 * whose numbers go back to what they were.  target: of the pairs, row: slots of
 * the row. */
INLINED void return_step(int kept, const mho_program_step *step, const int *row,
                         const int *target, double *tape, double *form,
                         mho_program_trace *trace, double *error)
{
  size_t each = 2 * (size_t)kept * L;
  double *high = trace->high, *hat = trace->adjoint, *response = trace->response;
  for (int l = 0; l < L; l += V) {
    double *value = tape + 2 * L + l, *own = response + (size_t)step->pivot * each + l;
    vector w = AT(tape, l), r[PROGRAM_KEPT_MAX] = {{0}}, u[PROGRAM_KEPT_MAX], sum = {0};
    for (int i = 0, p = 0; i < step->row; p += step->row - i++) {
      vector a = AT(value, i * L);
      for (int c = 0; c < kept; c++)
        r[c] -= a * AT(response + (size_t)target[p] * each + l, c * L);
    }
    for (int c = 0; c < kept; c++) AT(own, c * L) = r[c] = r[c] * w;
    for (int c = 0; c < kept; c++) {
      u[c] = AT(form + l, c * kept * L) * r[0];
      for (int b = 1; b < kept; b++) u[c] += AT(form + l, (c * kept + b) * L) * r[b];
      AT(own, (kept + c) * L) = u[c];
      sum += u[c] * r[c];
    }
    AT(high + (size_t)step->pivot * L, l) = AT(tape, L + l);
    AT(hat + (size_t)step->pivot * L, l) = 0.5 * sum;
    vector errors = AT(error, l);
    for (int i = 0, p = 0; i < step->row; i++) {
      vector a = AT(value, i * L), aw = a * w;
      double *from = response + (size_t)target[p] * each + l;
      AT(high + (size_t)row[i] * L, l) = a;
      if (step->loads) {
        sum = u[0] * AT(from, 0);
        for (int c = 1; c < kept; c++) sum += u[c] * AT(from, c * L);
        AT(hat + (size_t)row[i] * L, l) = sum;
      }
      for (int j = i, diagonal = p; j < step->row; diagonal += step->row - j++, p++) {
        size_t s = (size_t)(target[p] < 0 ? ~target[p] : target[p]) * L;
        double *to = response + (size_t)target[diagonal] * each + l;
        sum = AT(from, kept * L) * AT(to, 0);
        for (int c = 1; c < kept; c++) sum += AT(from, (kept + c) * L) * AT(to, c * L);
        if (i == j) sum *= 0.5;
        vector product = aw * AT(value, j * L), after = AT(high + s, l);
        AT(hat + s, l) = sum;
        errors += ABSOLUTE(sum) * (3.0 * ABSOLUTE(product) + ABSOLUTE(after));
        AT(high + s, l) = after + product;
      }
    }
    AT(error, l) = errors;
  }
}

/* kept is a constant where this is inlined for the usual case. */
INLINED void backward(int kept, const mho_program *program, const double *at_ev,
                      double roundoff, mho_program_trace *trace)
{
  const mho_program_load *load = program->load + program->loads;
  const int *slot = program->slot + program->slots_listed;
  double *tape = trace->tape + program->taped * L, energy_ev[L];
  keep(energy_ev, at_ev);
  double *hat = trace->adjoint, total[L] = {0}, kappa[L] = {0}, error[L] = {0};
  double form[PROGRAM_KEPT_MAX * PROGRAM_KEPT_MAX * L]; /* Q */
  for (int a = 0; a < kept; a++)
    for (int b = 0; b < kept; b++) {
      int at = program->kept_slot[a][b];
      for (int l = 0; l < L; l++)
        form[(a * kept + b) * L + l] =
            at < 0 ? 0 : (a == b ? 2 : 1) * hat[(size_t)at * L + (size_t)l];
    }
  for (int i = 0; i < program->tail_loads; i++, load--)
    unload(load - 1, energy_ev, hat + (size_t)load[-1].slot * L, total, kappa, error);
  for (int a = 0; a < kept; a++) { /* a kept site answers to itself alone */
    double *r = trace->response + (size_t)program->kept_slot[a][a] * 2 * (size_t)kept * L;
    for (int b = 0; b < kept; b++)
      for (int l = 0; l < L; l++) {
        r[b * L + l] = a == b;
        r[(kept + b) * L + l] = form[(a * kept + b) * L + l];
      }
  }
  for (size_t k = program->steps; k-- > 0;) {
    const mho_program_step *step = &program->step[k];
    const int *target = slot - step->row * (step->row + 1) / 2, *row = target - step->row;
    tape -= (size_t)(step->row + 2) * L;
    return_step(kept, step, row, target, tape, form, trace, error);
    for (int i = 0; i < step->loads; i++, load--)
      unload(load - 1, energy_ev, hat + (size_t)load[-1].slot * L, total, kappa, error);
    slot = row;
  }
  for (int l = 0; l < L; l++) {
    trace->kappa[l] = kappa[l] + fabs(total[l] * energy_ev[l]);
    trace->error[l] = roundoff * error[l];
  }
}

FOR_EVERY_PROCESSOR
void mho_program_backward(const mho_program *program, const double *energy_ev,
                          double roundoff, mho_program_trace *trace)
{
  if (program->kept == 2) backward(2, program, energy_ev, roundoff, trace);
  else backward(program->kept, program, energy_ev, roundoff, trace);
}
