/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The last step of a compiled elimination for contacts of one site each, all
 * energies of a batch at once.  With the Schur complement [[a, b], [b, c]] and
 * A = a - Sigma_L, C = c - Sigma_R, D = A C - b^2,
 *
 *   T = Gamma_L Gamma_R b^2 / |D|^2,
 *   dlnT/da = -2 Re(C/D),  dlnT/dc = -2 Re(A/D),  dlnT/db = 2/b + 4 b Re(1/D).
 *
 * Only the leading parts count; what the others would change is part of the error.
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

FOR_EVERY_PROCESSOR
void mho_program_finish_pair(const mho_plan *plan, mho_program_trace *trace,
                             double *transmission, double *relative_error)
{
  const mho_program *program = plan->program;
  const double *restrict a = PROGRAM_NUMBER(trace, program->kept_slot[0][0]);
  const double *restrict b = PROGRAM_NUMBER(trace, program->kept_slot[0][1]);
  const double *restrict c = PROGRAM_NUMBER(trace, program->kept_slot[1][1]);
  double *restrict a_hat = trace->adjoint, *restrict b_hat = trace->adjoint + 2 * L;
  double *restrict c_hat = trace->adjoint + 3 * L;
  int to_low = trace->lanes;
  double v0 = plan->vector[plan->support[0]];
  double v1 = plan->vector[plan->sites + plan->support[1]];
  double x0 = plan->shift_ev[0] * v0 * v0, y0 = 0.5 * plan->coupling_ev[0] * v0 * v0;
  double x1 = plan->shift_ev[1] * v1 * v1, y1 = 0.5 * plan->coupling_ev[1] * v1 * v1;
#pragma GCC ivdep
  for (int l = 0; l < to_low; l++) {
    double p = a[l] - x0, q = c[l] - x1, square = b[l] * b[l];
    double re = p * q - y0 * y1 - square, im = p * y1 + q * y0; /* D */
    double inverse = 1.0 / (re * re + im * im), small = sqrt(inverse);
    double to_a = -2 * (q * re + y1 * im) * inverse, to_c = -2 * (p * re + y0 * im) * inverse;
    double to_b = 2 / b[l] + 4 * b[l] * re * inverse;
    double size = (fabs(a[l]) + fabs(x0) + y0) * (fabs(c[l]) + fabs(x1) + y1);
    double error = UNIT_ROUNDOFF * (16 + 2 * (8 * size + 4 * square) * small);
    double low = fabs(to_a * a[to_low + l]) + fabs(to_b * b[to_low + l]) +
                 fabs(to_c * c[to_low + l]);
    a_hat[l] = to_a;
    b_hat[l] = to_b;
    c_hat[l] = to_c;
    transmission[l] = 4 * y0 * y1 * square * inverse;
    relative_error[l] = error + low;
  }
}
