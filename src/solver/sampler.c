/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "solver/sampler.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/processor.h"

enum { L = SAMPLER_LANES, W = REDUCTION_LANES, KEPT = REDUCTION_KEPT_MAX };

/* Pivots below this (times the norm) leave too few digits. */
#define PIVOT 1e-9

mho_status mho_sampler_init(const mho_plan *plan, mho_sampler *sampler)
{
  *sampler = (mho_sampler){.plan = plan};
  mho_status status = mho_reduction_create(plan, &sampler->reduction);
  if (status != MHO_OK || !sampler->reduction) return status;
  sampler->number = malloc((size_t)sampler->reduction->slots * W * sizeof(double));
  sampler->coupling = malloc((size_t)plan->channels * sizeof(double));
  if (!sampler->number || !sampler->coupling) return MHO_ERR_MEMORY;
  if (sampler->reduction->pair && sampler->reduction->kept_slot[0][1] >= 0) return MHO_OK;
  sampler->contacts = *sampler->reduction->contacts;
  sampler->contacts.coupling_ev = sampler->coupling;
  sampler->reduced = mho_elimination_create_double(&sampler->contacts);
  return sampler->reduced ? MHO_OK : MHO_ERR_MEMORY;
}

void mho_sampler_clear(mho_sampler *sampler)
{
  mho_reduction_free(sampler->reduction);
  free(sampler->number);
  free(sampler->coupling);
  mho_elimination_free_double(sampler->reduced);
  *sampler = (mho_sampler){0};
}

mho_status mho_sample_batch_init(const mho_sampler *sampler, mho_sample_batch *batch)
{
  *batch = (mho_sample_batch){0};
  batch->value_ev = calloc((size_t)sampler->reduction->slots * L, sizeof(double));
  batch->coupling = calloc((size_t)sampler->plan->channels * L, sizeof(double));
  return batch->value_ev && batch->coupling ? MHO_OK : MHO_ERR_MEMORY;
}

void mho_sample_batch_clear(mho_sample_batch *batch)
{
  free(batch->value_ev);
  free(batch->coupling);
  *batch = (mho_sample_batch){0};
}

FOR_EVERY_PROCESSOR
static void load(const mho_reduction *reduction, const mho_sample_batch *batch, double offset_ev,
                 double *number)
{
  const double *value = batch->value_ev;
  for (int s = 0; s < reduction->slots; s++, value += L, number += W) {
    double weight = s < reduction->sites ? 1.0 : 0.0;
    for (int l = 0; l < L; l++) {
      number[l] = weight * (batch->energy_ev[l] - offset_ev) - value[l];
      number[L + l] = weight * (batch->energy_ev[l] + offset_ev) - value[l];
    }
  }
}

/* One site a contact: T = Gamma_L Gamma_R b^2 / |A C - b^2|^2, program_pair.c. */
FOR_EVERY_PROCESSOR
static void finish_pair(const mho_plan *plan, const mho_reduction *reduction,
                        const double *number, const double *coupling, double *transmission)
{
  double v0 = plan->vector[plan->support[0]], v1 = plan->vector[plan->sites + plan->support[1]];
  double x0 = plan->shift_ev[0] * v0 * v0, x1 = plan->shift_ev[1] * v1 * v1;
  for (int l = 0; l < L; l++) transmission[l] = 0;
  for (int energy = 0; energy < W; energy += L) {
    const double *a = number + reduction->kept_slot[0][0] * W + energy;
    const double *b = number + reduction->kept_slot[0][1] * W + energy;
    const double *c = number + reduction->kept_slot[1][1] * W + energy;
    for (int l = 0; l < L; l++) {
      double y0 = 0.5 * coupling[l] * v0 * v0, y1 = 0.5 * coupling[L + l] * v1 * v1;
      double p = a[l] - x0, q = c[l] - x1, square = b[l] * b[l];
      double re = p * q - y0 * y1 - square, im = p * y1 + q * y0;
      transmission[l] += 4 * y0 * y1 * square / (re * re + im * im);
    }
  }
}

/* Other contacts: T at one of all places. */
static double finish_place(mho_sampler *sampler, const double *coupling, int at, bool *broken)
{
  const mho_reduction *reduction = sampler->reduction;
  int n = reduction->kept;
  double value[KEPT * KEPT], adjoint[KEPT * KEPT];
  for (int k = 0; k < n * n; k++) {
    int slot = reduction->kept_slot[k / n][k % n];
    value[k] = slot < 0 ? 0 : sampler->number[slot * W + at];
  }
  for (int c = 0; c < sampler->plan->channels; c++)
    sampler->coupling[c] = coupling[c * L + at % L];
  mho_estimate estimate;
  mho_elimination_reduced_double(&sampler->contacts, sampler->reduced, value, adjoint, &estimate);
  *broken |= !(estimate.relative_error < 1e-3);
  return *broken ? 0 : estimate.transmission;
}

void mho_sampler_evaluate(mho_sampler *sampler, const mho_sample_batch *batch, int lanes,
                          double offset_ev, double *transmission, bool *broken)
{
  double largest_inverse[W], norm_ev = sampler->plan->norm_ev;
  load(sampler->reduction, batch, offset_ev, sampler->number);
  mho_reduction_run(sampler->reduction, lanes, sampler->number, largest_inverse);
  for (int l = 0; l < lanes; l++)
    broken[l] |= !(fmax(largest_inverse[l], largest_inverse[L + l]) * PIVOT * norm_ev < 1.0);
  if (!sampler->reduced)
    finish_pair(sampler->plan, sampler->reduction, sampler->number, batch->coupling, transmission);
  for (int l = 0; sampler->reduced && l < lanes; l++)
    transmission[l] = finish_place(sampler, batch->coupling, l, &broken[l]) +
                      finish_place(sampler, batch->coupling, L + l, &broken[l]);
}
