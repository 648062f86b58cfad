/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * With S the reduction of E - H to the sites of two contacts, K = (S - Sigma)^-1
 * and r_i the answers of site i to the two (r_i = -sum_j a_ij r_j / d_i over its
 * row when it was eliminated, one and zero at the contacts), G v_c = r K_.c and
 *
 *   dlnT/de_i = r_i^T Q r_i,  dlnT/dt_ij = r_i^T (Q + Q^T) r_j,
 *   Q_cd = 2 Re [K_c0 K_1d / K_10].
 */
#include "solver/gradient_sum.h"

#include <math.h>
#include <stdlib.h>

#include "base/processor.h"
#include "solver/reduction.h"

enum { W = REDUCTION_LANES };

/* What mho_gradient_evaluate asks of itself. */
#define TOLERANCE 1e-10

typedef struct {
  const mho_plan *plan;
  mho_reduction *reduction;
  double *number;   /* [slots][lanes] */
  double *answer;   /* [sites][2][lanes] */
  double *gradient; /* [slots][lanes]: dlnT/dvalue of H's numbers */
  int *slot_of_pair;
  mho_gradient *sum, *single;
} summer;

/* What follows from the reduced numbers, in lanes. */
typedef struct {
  double q00[W], q01[W], q11[W]; /* q01: (Q + Q^T)_01 / 2 */
  double coupling[2][W], transmission[W];
} finish;

FOR_EVERY_PROCESSOR
static void load(const mho_reduction *r, const double *energy_ev, double *number)
{
  for (int s = 0; s < r->slots; s++, number += W) {
    double weight = s < r->sites ? 1.0 : 0.0, value = r->value_ev[s];
    for (int l = 0; l < W; l++) number[l] = weight * energy_ev[l] - value;
  }
}

/* dlnT/dGamma = (1/y + 2 Im(C/D)) v^2/2 with y = Gamma v^2/2. */
FOR_EVERY_PROCESSOR
static void finish_lanes(const summer *s, finish *f)
{
  const mho_plan *plan = s->plan;
  const int(*slot)[REDUCTION_KEPT_MAX] = s->reduction->kept_slot;
  const double *a = s->number + slot[0][0] * W, *b = s->number + slot[0][1] * W;
  const double *c = s->number + slot[1][1] * W;
  double v0 = plan->vector[plan->support[0]], v1 = plan->vector[plan->sites + plan->support[1]];
  double half0 = 0.5 * v0 * v0, half1 = 0.5 * v1 * v1;
  double y0 = half0 * plan->coupling_ev[0], y1 = half1 * plan->coupling_ev[1];
  double x0 = 2 * half0 * plan->shift_ev[0], x1 = 2 * half1 * plan->shift_ev[1];
  for (int l = 0; l < W; l++) {
    double p = a[l] - x0, q = c[l] - x1, square = b[l] * b[l];
    double re = p * q - y0 * y1 - square, im = p * y1 + q * y0;
    double inverse = 1.0 / (re * re + im * im);
    f->q00[l] = 2 * (q * re + y1 * im) * inverse; /* 2 Re K_00 = 2 Re(C/D) */
    f->q11[l] = 2 * (p * re + y0 * im) * inverse;
    f->q01[l] = -(1 / b[l] + 2 * b[l] * re * inverse);
    f->coupling[0][l] = half0 * (1 / y0 + 2 * (y1 * re - q * im) * inverse);
    f->coupling[1][l] = half1 * (1 / y1 + 2 * (y0 * re - p * im) * inverse);
    f->transmission[l] = 4 * y0 * y1 * square * inverse;
  }
}

FOR_EVERY_PROCESSOR
static void answer_all(const summer *s)
{
  const mho_reduction *r = s->reduction;
  const int *list = r->list;
  for (int k = 0; k < r->steps; k++)
    list += 2 * r->step[k].row + r->step[k].row * (r->step[k].row + 1) / 2;
  for (int side = 0; side < 2; side++)
    for (int c = 0; c < 2; c++)
      for (int l = 0; l < W; l++) s->answer[(r->kept_site[side] * 2 + c) * W + l] = side == c;
  for (int k = r->steps; k-- > 0;) {
    int row = r->step[k].row, site = r->step[k].site;
    list -= 2 * row + row * (row + 1) / 2;
    double sum0[W] = {0}, sum1[W] = {0}, *own = s->answer + site * 2 * W;
    const double *pivot = s->number + site * W;
    for (int i = 0; i < row; i++) {
      const double *value = s->number + list[i] * W, *other = s->answer + list[row + i] * 2 * W;
      for (int l = 0; l < W; l++) {
        sum0[l] -= value[l] * other[l];
        sum1[l] -= value[l] * other[W + l];
      }
    }
    for (int l = 0; l < W; l++) {
      double w = 1.0 / pivot[l];
      own[l] = sum0[l] * w;
      own[W + l] = sum1[l] * w;
    }
  }
}

FOR_EVERY_PROCESSOR
static void differentiate(const summer *s, const finish *f)
{
  const mho_reduction *r = s->reduction;
  for (int k = 0; k < r->slots; k++) {
    const double *i = s->answer + r->between[k][0] * 2 * W;
    const double *j = s->answer + r->between[k][1] * 2 * W;
    double twice = k < r->sites ? 1.0 : 2.0, *to = s->gradient + k * W;
    for (int l = 0; l < W; l++)
      to[l] = twice * (f->q00[l] * i[l] * j[l] + f->q11[l] * i[W + l] * j[W + l] +
                       f->q01[l] * (i[l] * j[W + l] + j[l] * i[W + l]));
  }
}

/* Adds one lane; false where Euler's identity does not hold well enough. */
static bool add_lane(summer *s, const finish *f, int lane, double energy_ev, double weight)
{
  const mho_plan *plan = s->plan;
  const mho_reduction *r = s->reduction;
  mho_gradient *sum = s->sum;
  double euler = 0, kappa = 0, energy = 0;
  for (int k = 0; k < r->slots; k++) {
    double slope = s->gradient[k * W + lane];
    euler += slope * r->value_ev[k];
    kappa += fabs(slope * r->value_ev[k]);
    if (k < r->sites) energy -= slope;
  }
  euler += energy * energy_ev;
  for (int c = 0; c < 2; c++) {
    double v = plan->vector[c * plan->sites + plan->support[c]];
    euler += f->coupling[c][lane] * plan->coupling_ev[c] +
             s->gradient[plan->support[c] * W + lane] * plan->shift_ev[c] * v * v;
  }
  if (!(fabs(euler) <= TOLERANCE * (1 + kappa + fabs(energy * energy_ev)))) return false;
  for (int i = 0; i < r->sites; i++) sum->onsite[i] += weight * s->gradient[i * W + lane];
  for (size_t p = 0; p < sum->pairs; p++)
    sum->hopping[p] += weight * s->gradient[s->slot_of_pair[p] * W + lane];
  for (int c = 0; c < 2; c++) sum->coupling[c] += weight * f->coupling[c][lane];
  sum->energy += weight * energy;
  return true;
}

static mho_status add_single(summer *s, double energy_ev, double weight, mho_error *error)
{
  mho_gradient *g = s->single, *sum = s->sum;
  mho_status status = mho_gradient_evaluate(s->plan, energy_ev, g, error);
  if (status != MHO_OK || g->point.node) return status;
  for (int i = 0; i < g->sites; i++) sum->onsite[i] += weight * g->onsite[i];
  for (size_t p = 0; p < g->pairs; p++) sum->hopping[p] += weight * g->hopping[p];
  for (int c = 0; c < g->left + g->right; c++) sum->coupling[c] += weight * g->coupling[c];
  sum->energy += weight * g->energy;
  return MHO_OK;
}

static mho_status add_batch(summer *s, size_t count, const double *energy_ev,
                            const double *transmission, const double *weight, mho_error *error)
{
  double energy[W], largest_inverse[W];
  finish f;
  for (size_t l = 0; l < W; l++) energy[l] = energy_ev[l < count ? l : 0];
  load(s->reduction, energy, s->number);
  mho_reduction_run(s->reduction, W / 2, s->number, largest_inverse);
  finish_lanes(s, &f);
  answer_all(s);
  differentiate(s, &f);
  mho_status status = MHO_OK;
  for (size_t l = 0; status == MHO_OK && l < count; l++) {
    bool same = transmission[l] > 0 &&
                fabs(f.transmission[l] - transmission[l]) <= TOLERANCE * transmission[l];
    if (!same || !add_lane(s, &f, (int)l, energy[l], weight[l]))
      status = add_single(s, energy[l], weight[l], error);
  }
  return status;
}

/* Makes room for many energies at a time; not where the contacts are not two
 * sites, or a pair that is asked for is zero in H. */
static mho_status prepare(summer *s)
{
  mho_status status = mho_reduction_create(s->plan, &s->reduction);
  mho_reduction *r = s->reduction;
  if (status != MHO_OK || !r) return status;
  bool serves = r->pair && r->kept_slot[0][1] >= 0;
  s->number = malloc((size_t)r->slots * W * sizeof(double));
  s->gradient = malloc((size_t)r->slots * W * sizeof(double));
  s->answer = malloc((size_t)r->sites * 2 * W * sizeof(double));
  s->slot_of_pair = malloc((s->sum->pairs + 1) * sizeof(int));
  if (!s->number || !s->gradient || !s->answer || !s->slot_of_pair) return MHO_ERR_MEMORY;
  for (size_t p = 0; p < s->sum->pairs; p++) {
    s->slot_of_pair[p] = mho_reduction_find(r, s->sum->pair[p][0], s->sum->pair[p][1]);
    serves = serves && s->slot_of_pair[p] >= 0;
  }
  if (!serves) {
    mho_reduction_free(r);
    s->reduction = NULL;
  }
  return MHO_OK;
}

mho_status mho_gradient_sum(const mho_plan *plan, size_t count, const double *energy_ev,
                            const double *transmission, const double *weight, mho_gradient *sum,
                            mho_error *error)
{
  summer s = {.plan = plan, .sum = sum};
  mho_status status =
      mho_gradient_create(plan, (const int(*)[2])sum->pair, sum->pairs, &s.single, error);
  if (status == MHO_OK && prepare(&s) != MHO_OK)
    status = mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  for (size_t i = 0; s.reduction && status == MHO_OK && i < count; i += W)
    status = add_batch(&s, count - i < W ? count - i : W, energy_ev + i, transmission + i,
                       weight + i, error);
  for (size_t i = 0; !s.reduction && status == MHO_OK && i < count; i++)
    status = add_single(&s, energy_ev[i], weight[i], error);
  mho_reduction_free(s.reduction);
  mho_gradient_free(s.single);
  free(s.number);
  free(s.gradient);
  free(s.answer);
  free(s.slot_of_pair);
  return status;
}
