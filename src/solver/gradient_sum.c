/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "solver/gradient_sum.h"

#include <math.h>
#include <stdlib.h>

#include "solver/plan.h"
#include "solver/processor.h"
#include "solver/program.h"

enum { L = PROGRAM_LANES };

/* What mho_gradient_evaluate asks of itself. */
#define TOLERANCE 1e-10

typedef struct {
  const mho_plan *plan;
  mho_program_trace trace;
  double *gradient; /* [loads][lanes] */
  int *load_of_pair;
  mho_gradient *sum, *single;
  bool *any;
} summer;

/* False where some pair that is asked for is zero in H. */
static bool find_pairs(summer *s)
{
  const mho_program *program = s->plan->program;
  for (size_t p = 0; p < s->sum->pairs; p++) {
    const int *pair = s->sum->pair[p];
    s->load_of_pair[p] = -1;
    for (size_t k = 0; k < program->loads; k++) {
      const int *ends = program->between[k];
      if ((ends[0] == pair[0] && ends[1] == pair[1]) || (ends[0] == pair[1] && ends[1] == pair[0]))
        s->load_of_pair[p] = (int)k;
    }
    if (s->load_of_pair[p] < 0) return false;
  }
  return true;
}

/* dlnT/dGamma = (1/y + 2 Im(C/D)) v^2/2 with y = Gamma v^2/2; program_pair.c. */
static void find_couplings(const summer *s, size_t lane, double coupling[2])
{
  const mho_plan *plan = s->plan;
  const mho_program *program = plan->program;
  double number[3]; /* a, b, c */
  for (int k = 0; k < 3; k++)
    number[k] = s->trace.high[(size_t)program->kept_slot[k / 2][(k + 1) / 2] * L + lane];
  double square[2], y[2], re[2];
  for (int c = 0; c < 2; c++) {
    double v = plan->vector[c * plan->sites + plan->support[c]];
    square[c] = v * v;
    y[c] = 0.5 * plan->coupling_ev[c] * square[c];
    re[c] = number[2 * c] - plan->shift_ev[c] * square[c];
  }
  double d_re = re[0] * re[1] - y[0] * y[1] - number[1] * number[1];
  double d_im = re[0] * y[1] + re[1] * y[0], inverse = 1 / (d_re * d_re + d_im * d_im);
  for (int c = 0; c < 2; c++)
    coupling[c] = 0.5 * square[c] *
                  (1 / y[c] + 2 * (y[!c] * d_re - re[!c] * d_im) * inverse);
}

/* Adds one lane; false where Euler's identity does not hold well enough. */
static bool add_lane(summer *s, size_t lane, const double coupling[2], double energy_ev,
                     double weight)
{
  const mho_plan *plan = s->plan;
  const mho_program *program = plan->program;
  double euler = 0, energy = 0;
  for (size_t k = 0; k < program->loads; k++) {
    double hat = s->gradient[k * L + lane];
    euler -= hat * program->load[k].value;
    if (program->load[k].site >= 0) energy += hat;
  }
  euler += energy * energy_ev;
  for (int c = 0; c < 2; c++) {
    double v = plan->vector[c * plan->sites + plan->support[c]];
    size_t contact = 0; /* the diagonal of its site */
    while (program->between[contact][0] != plan->support[c] ||
           program->between[contact][1] != plan->support[c])
      contact++;
    euler += coupling[c] * plan->coupling_ev[c] -
             s->gradient[contact * L + lane] * plan->shift_ev[c] * v * v;
  }
  if (!(fabs(euler) <= TOLERANCE * (1 + s->trace.kappa[lane]))) return false;
  for (size_t k = 0; k < program->loads; k++)
    if (program->load[k].site >= 0)
      s->sum->onsite[program->load[k].site] -= weight * s->gradient[k * L + lane];
  for (size_t p = 0; p < s->sum->pairs; p++)
    s->sum->hopping[p] -= weight * s->gradient[(size_t)s->load_of_pair[p] * L + lane];
  for (int c = 0; c < 2; c++) s->sum->coupling[c] += weight * coupling[c];
  s->sum->energy += weight * energy;
  *s->any = true;
  return true;
}

static mho_status add_single(summer *s, double energy_ev, double weight, mho_error *error)
{
  mho_gradient *g = s->single, *sum = s->sum;
  mho_status status = mho_gradient_evaluate(s->plan, energy_ev, g, error);
  if (status != MHO_OK || g->point.node) return status;
  *s->any = true;
  for (int i = 0; i < g->sites; i++) sum->onsite[i] += weight * g->onsite[i];
  for (size_t p = 0; p < g->pairs; p++) sum->hopping[p] += weight * g->hopping[p];
  for (int c = 0; c < g->left + g->right; c++) sum->coupling[c] += weight * g->coupling[c];
  sum->energy += weight * g->energy;
  return MHO_OK;
}

/* Up to L energies by the program. */
static mho_status add_batch(summer *s, size_t count, const double *energy_ev,
                            const double *weight, mho_error *error)
{
  const mho_plan *plan = s->plan;
  double energy[L], transmission[L], relative_error[L], coupling[L][2];
  for (size_t l = 0; l < L; l++) energy[l] = energy_ev[l < count ? l : 0];
  mho_program_forward_double(plan->program, energy, plan->norm_ev, &s->trace);
  mho_program_finish_pair(plan, false, &s->trace, transmission, relative_error);
  for (size_t l = 0; l < count; l++) find_couplings(s, l, coupling[l]);
  mho_program_backward(plan->program, energy, ROUNDOFF_DOUBLE, &s->trace);
  mho_status status = MHO_OK;
  for (size_t l = 0; status == MHO_OK && l < count; l++) {
    bool good = !s->trace.broken[l] && transmission[l] > 1e-200 &&
                relative_error[l] + 1.5 * s->trace.error[l] < TOLERANCE;
    if (!good || !add_lane(s, l, coupling[l], energy[l], weight[l]))
      status = add_single(s, energy[l], weight[l], error);
  }
  return status;
}

mho_status mho_gradient_sum(const mho_plan *plan, size_t count, const double *energy_ev,
                            const double *weight, mho_gradient *sum, bool *any,
                            mho_error *error)
{
  summer s = {.plan = plan, .sum = sum, .any = any};
  *any = false;
  mho_status status = mho_gradient_create(plan, (const int(*)[2])sum->pair, sum->pairs, &s.single, error);
  bool many = plan->program && plan->connected && mho_program_is_pair(plan) &&
              !plan->has_chain[MHO_LEFT] && !plan->has_chain[MHO_RIGHT];
  if (status == MHO_OK && many) {
    s.gradient = malloc(plan->program->loads * L * sizeof(double));
    s.load_of_pair = malloc((sum->pairs + 1) * sizeof(int));
    if (!s.gradient || !s.load_of_pair ||
        mho_program_trace_create(plan->program, &s.trace) != MHO_OK)
      status = mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
    else many = find_pairs(&s);
    s.trace.gradient = s.gradient;
  }
  size_t step = many ? L : 1;
  for (size_t i = 0; status == MHO_OK && i < count; i += step)
    status = many ? add_batch(&s, count - i < L ? count - i : L, energy_ev + i, weight + i, error)
                  : add_single(&s, energy_ev[i], weight[i], error);
  mho_program_trace_clear(&s.trace);
  mho_gradient_free(s.single);
  free(s.gradient);
  free(s.load_of_pair);
  return status;
}
