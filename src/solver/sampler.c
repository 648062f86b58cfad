/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "solver/sampler.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "solver/processor.h"
#include "solver/program.h"

enum { L = SAMPLER_LANES, V = 8 };

/* Pivots below this (times the norm) leave too few digits. */
#define PIVOT 1e-6

typedef double vector __attribute__((vector_size(V * sizeof(double)), aligned(8), may_alias));
typedef long long bits __attribute__((vector_size(V * sizeof(double)), aligned(8), may_alias));
#define AT(array, l) (*(vector *)((array) + (l)))
#define ABSOLUTE(x) ((vector)((bits)(x) & ((bits){0} + 0x7fffffffffffffffLL)))

bool mho_sampler_serves(const mho_plan *plan)
{
  return plan->program && plan->connected && !plan->has_chain[MHO_LEFT] &&
         !plan->has_chain[MHO_RIGHT];
}

mho_status mho_sampler_init(const mho_plan *plan, mho_sampler *sampler)
{
  *sampler = (mho_sampler){.plan = plan};
  sampler->slot = malloc(((size_t)plan->program->slots + 1) * L * sizeof(double));
  sampler->coupling = malloc((size_t)plan->channels * sizeof(double));
  if (!sampler->slot || !sampler->coupling) return MHO_ERR_MEMORY;
  if (mho_program_is_pair(plan)) return MHO_OK;
  sampler->contacts = *plan->contacts;
  sampler->contacts.coupling_ev = sampler->coupling;
  sampler->reduced = mho_elimination_create_double(plan->contacts);
  return sampler->reduced ? MHO_OK : MHO_ERR_MEMORY;
}

void mho_sampler_clear(mho_sampler *sampler)
{
  free(sampler->slot);
  free(sampler->coupling);
  mho_elimination_free_double(sampler->reduced);
  *sampler = (mho_sampler){0};
}

mho_status mho_sample_batch_init(const mho_plan *plan, mho_sample_batch *batch)
{
  *batch = (mho_sample_batch){0};
  batch->value = calloc(plan->program->loads * L, sizeof(double));
  batch->coupling = calloc((size_t)plan->channels * L, sizeof(double));
  return batch->value && batch->coupling ? MHO_OK : MHO_ERR_MEMORY;
}

void mho_sample_batch_clear(mho_sample_batch *batch)
{
  free(batch->value);
  free(batch->coupling);
  *batch = (mho_sample_batch){0};
}

/* Eliminates in lanes; *largest_inverse is that of the pivots. */
FOR_EVERY_PROCESSOR
static void eliminate(const mho_program *program, double *value, double *energy_ev,
                      double *slots, double *largest_inverse)
{
  const mho_program_load *load = program->load;
  const int *slot = program->slot;
  for (size_t k = 0; k <= program->steps; k++) {
    bool last = k == program->steps;
    const mho_program_step *step = &program->step[last ? 0 : k];
    int loads = last ? program->tail_loads : step->loads, row = last ? 0 : step->row;
    for (int i = 0; i < loads; i++, load++, value += L) {
      double *to = slots + (size_t)load->slot * L, weight = load->site >= 0 ? 1.0 : 0.0;
      for (int l = 0; l < L; l += V) AT(to, l) = weight * AT(energy_ev, l) - AT(value, l);
    }
    if (last) break;
    for (int l = 0; l < L; l += V) {
      double *lane = slots + l;
      const int *target = slot + row;
      vector w = 1.0 / AT(lane, (size_t)step->pivot * L), size = ABSOLUTE(w);
      vector before = AT(largest_inverse, l);
      bits larger = size > before;
      AT(largest_inverse, l) = (vector)(((bits)size & larger) | ((bits)before & ~larger));
      for (int i = 0; i < row; i++) {
        vector aw = AT(lane, (size_t)slot[i] * L) * w;
        for (int j = i; j < row; j++, target++) {
          vector product = aw * AT(lane, (size_t)slot[j] * L);
          if (*target < 0) AT(lane, (size_t)~*target * L) = -product;
          else AT(lane, (size_t)*target * L) -= product;
        }
      }
    }
    slot += row + row * (row + 1) / 2;
  }
}

/* One site a contact: T = Gamma_L Gamma_R b^2 / |A C - b^2|^2, program_pair.c. */
FOR_EVERY_PROCESSOR
static void finish_pair(const mho_plan *plan, const double *slots, const double *coupling,
                        double *transmission)
{
  const mho_program *program = plan->program;
  const double *a = slots + (size_t)program->kept_slot[0][0] * L;
  const double *b = slots + (size_t)program->kept_slot[0][1] * L;
  const double *c = slots + (size_t)program->kept_slot[1][1] * L;
  double v0 = plan->vector[plan->support[0]], v1 = plan->vector[plan->sites + plan->support[1]];
  double x0 = plan->shift_ev[0] * v0 * v0, x1 = plan->shift_ev[1] * v1 * v1;
  for (int l = 0; l < L; l++) {
    double y0 = 0.5 * coupling[l] * v0 * v0, y1 = 0.5 * coupling[L + l] * v1 * v1;
    double p = a[l] - x0, q = c[l] - x1, square = b[l] * b[l];
    double re = p * q - y0 * y1 - square, im = p * y1 + q * y0;
    transmission[l] = 4 * y0 * y1 * square / (re * re + im * im);
  }
}

/* Other contacts, lane by lane. */
static void finish_lane(mho_sampler *sampler, const double *coupling, int lane,
                        double *transmission, bool *broken)
{
  const mho_program *program = sampler->plan->program;
  size_t n = (size_t)program->kept;
  double value[PROGRAM_KEPT_MAX * PROGRAM_KEPT_MAX], adjoint[PROGRAM_KEPT_MAX * PROGRAM_KEPT_MAX];
  for (size_t k = 0; k < n * n; k++) {
    int slot = program->kept_slot[k / n][k % n];
    value[k] = slot < 0 ? 0 : sampler->slot[(size_t)slot * L + (size_t)lane];
  }
  for (int c = 0; c < sampler->plan->channels; c++) sampler->coupling[c] = coupling[c * L + lane];
  mho_estimate estimate;
  mho_elimination_reduced_double(&sampler->contacts, sampler->reduced, value, adjoint, &estimate);
  *broken |= !(estimate.relative_error < 1e-3);
  *transmission = *broken ? 0 : estimate.transmission;
}

void mho_sampler_evaluate(mho_sampler *sampler, const mho_sample_batch *batch, double offset_ev,
                          double *transmission, bool *broken)
{
  double energy_ev[L], largest_inverse[L] = {0};
  for (int l = 0; l < L; l++) energy_ev[l] = batch->energy_ev[l] + offset_ev;
  eliminate(sampler->plan->program, batch->value, energy_ev, sampler->slot, largest_inverse);
  for (int l = 0; l < L; l++)
    broken[l] |= !(largest_inverse[l] * PIVOT * sampler->plan->norm_ev < 1.0);
  if (!sampler->reduced)
    finish_pair(sampler->plan, sampler->slot, batch->coupling, transmission);
  for (int l = 0; sampler->reduced && l < L; l++)
    finish_lane(sampler, batch->coupling, l, &transmission[l], &broken[l]);
}
