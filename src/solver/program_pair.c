/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The last step of a compiled elimination for contacts of one site each, all
 * energies of a batch at once.  With the Schur complement [[a, b], [b, c]] and
 * A = a - Sigma_L, C = c - Sigma_R, D = A C - b^2,
 *
 *   T = Gamma_L Gamma_R b^2 / |D|^2,
 *   dlnT/da = -2 Re(C/D),  dlnT/dc = -2 Re(A/D),  dlnT/db = 2/b + 4 b Re(1/D).
 *
 * D in double-double, as its parts cancel at narrow resonances.
 */
#include <math.h>

#include "base/processor.h"
#include "solver/program.h"

enum { L = PROGRAM_LANES };

bool mho_program_is_pair(const mho_plan *plan)
{
  const mho_program *program = plan->program;
  return plan->left == 1 && plan->right == 1 && program->kept == 2 &&
         plan->support_start[1] == 1 && plan->support_start[2] == 2 &&
         program->kept_slot[0][1] >= 0;
}

typedef struct {
  double high, low;
} pair;

/* a + b and what rounding left out; D. E. Knuth, The Art of Computer Programming,
 * volume 2, section 4.2.2. */
INLINED pair sum(double a, double b)
{
  double high = a + b, part = high - a;
  return (pair){high, (a - (high - part)) + (b - part)};
}

INLINED pair product(pair a, pair b)
{
  double high = a.high * b.high;
  return (pair){high, __builtin_fma(a.high, b.high, -high) + (a.high * b.low + a.low * b.high)};
}

INLINED pair normal(double high, double low)
{
  double nearest = high + low;
  return (pair){nearest, low - (nearest - high)};
}

FOR_EVERY_PROCESSOR
void mho_program_finish_pair(const mho_plan *plan, mho_program_trace *trace,
                             double *transmission, double *relative_error)
{
  const mho_program *program = plan->program;
  const int lanes = trace->lanes;
  const double *restrict a = PROGRAM_NUMBER(trace, program->kept_slot[0][0]);
  const double *restrict b = PROGRAM_NUMBER(trace, program->kept_slot[0][1]);
  const double *restrict c = PROGRAM_NUMBER(trace, program->kept_slot[1][1]);
  double *restrict a_hat = trace->adjoint, *restrict b_hat = trace->adjoint + 2 * L;
  double *restrict c_hat = trace->adjoint + 3 * L;
  double v0 = plan->vector[plan->support[0]];
  double v1 = plan->vector[plan->sites + plan->support[1]];
  double x0 = plan->shift_ev[0] * v0 * v0, y0 = 0.5 * plan->coupling_ev[0] * v0 * v0;
  double x1 = plan->shift_ev[1] * v1 * v1, y1 = 0.5 * plan->coupling_ev[1] * v1 * v1;
  /* Of parts of D: in double-double, and what squares of v lose. */
  double unit = 64 * UNIT_ROUNDOFF * UNIT_ROUNDOFF;
  if (fabs(v0) != 1 || fabs(v1) != 1) unit += 8 * UNIT_ROUNDOFF;
  pair both = product((pair){y0, 0}, (pair){y1, 0});
#pragma GCC ivdep
  for (int l = 0; l < lanes; l++) {
    pair p = sum(a[l], -x0), q = sum(c[l], -x1);
    p = normal(p.high, p.low + a[lanes + l]);
    q = normal(q.high, q.low + c[lanes + l]);
    pair pq = product(p, q), square = product((pair){b[l], b[lanes + l]}, (pair){b[l], b[lanes + l]});
    pair first = sum(pq.high, -square.high), second = sum(first.high, -both.high);
    double re = second.high + (second.low + first.low + (pq.low - square.low - both.low));
    pair left = product(p, (pair){y1, 0}), right = product(q, (pair){y0, 0});
    pair side = sum(left.high, right.high);
    double im = side.high + (side.low + (left.low + right.low));
    double inverse = 1.0 / (re * re + im * im), small = sqrt(inverse);
    double to_a = -2 * (q.high * re + y1 * im) * inverse;
    double to_c = -2 * (p.high * re + y0 * im) * inverse;
    double size = (fabs(a[l]) + fabs(x0) + y0) * (fabs(c[l]) + fabs(x1) + y1);
    a_hat[l] = to_a;
    b_hat[l] = 2 / b[l] + 4 * b[l] * re * inverse;
    c_hat[l] = to_c;
    transmission[l] = 4 * y0 * y1 * square.high * inverse;
    relative_error[l] = 16 * UNIT_ROUNDOFF + 2 * unit * (size + square.high) * small;
  }
}
