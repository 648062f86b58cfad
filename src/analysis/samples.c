/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The samples of a batch go through one compiled elimination.  The thermal
 * average is that of Gauss's rule for the weight -df/dE (6 and 8 points, exact
 * for polynomials of degree 11 and 15), which converges while resonances stay
 * 0.5 eV away; where the two differ, the trapezoid rule is halved, whose error
 * squares with each halving (L. N. Trefethen and J. A. C. Weideman, SIAM Rev.
 * 56, 385 (2014)); what remains is left to the panels of thermal.c.
 */
#include "analysis/samples.h"

#include <mho/constants.h>

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "analysis/perturb.h"
#include "analysis/thermal.h"
#include "base/random.h"
#include "solver/logarithm.h"
#include "base/processor.h"
#include "solver/sampler.h"

enum { L = SAMPLER_LANES, SIX = 3, EIGHT = 4, HALVINGS = 5 };

#define LN_10 2.302585092994045684

/* Relative, of one conductance; the two rules of Gauss differ by ten times what
 * the better one errs. */
#define TOLERANCE 1e-4
#define GAUSS_DIFFERENCE 1e-3

/* Trapezoid rule: reach and first step in kT. */
#define REACH_KT 24.0
#define STEP_KT 1.5

/* Positive points in kT and weights for -df/dx = 1/(4 cosh^2(x/2)), from its
 * moments 2 (2k)! (1 - 2^(1-2k)) zeta(2k). */
static const double six[SIX][2] = {{1.32352067410643596, 0.46533805899767828},
                                   {4.84551377148137969, 0.0344852040473790165},
                                   {10.669629220108052, 0.000176736954942703565}};
static const double eight[EIGHT][2] = {{1.23115993570080066, 0.451313238384593151},
                                       {4.33803547324198917, 0.0479583700568333976},
                                       {8.93458764971100297, 0.00072720612756546812},
                                       {15.8076186188987224, 1.18543100798346259e-6}};

typedef struct {
  const mho_molecule *molecule;
  const mho_sensitivity_row *row;
  size_t count;
  double fermi_ev, kt_ev;
  uint64_t seed;
  mho_sampler sampler;
  mho_sample_batch batch, late; /* late: those that need the trapezoid rule */
  size_t late_index[L];
  int late_count;
  int *slot_of_bond; /* which number of the batch each one is; a site's is its own */
  double *onsite, *hopping, *cosine; /* [sites], [bonds], [bonds] of [L] */
  double *log10_g0;
  mho_error *error;
} drawer;

/* --- random numbers --------------------------------------------------------- */

/* cos(2 pi v) for 0 <= v < 1: sin(x) with x = 2 pi (|v - 1/2| - 1/4). */
INLINED double cosine_of_turn(double v)
{
  double from_half = v - 0.5, y = (from_half < 0 ? -from_half : from_half) - 0.25;
  double x = 6.283185307179586 * y, z = x * x;
  double sum = 1.0 / 51090942171709440000.0; /* 21! */
  sum = 1.0 / 121645100408832000.0 - sum * z;
  sum = 1.0 / 355687428096000.0 - sum * z;
  sum = 1.0 / 1307674368000.0 - sum * z;
  sum = 1.0 / 6227020800.0 - sum * z;
  sum = 1.0 / 39916800.0 - sum * z;
  sum = 1.0 / 362880.0 - sum * z;
  sum = 1.0 / 5040.0 - sum * z;
  sum = 1.0 / 120.0 - sum * z;
  sum = 1.0 / 6.0 - sum * z; /* 3! */
  return x - x * z * sum;
}

FOR_EVERY_PROCESSOR
void mho_samples_normals(uint64_t *state, double *normal)
{
  for (int l = 0; l < L; l++) {
    mho_random random = {state[l]};
    double u = ((double)(mho_random_bits(&random) >> 11) + 1.0) * 0x1p-53;
    double v = (double)(mho_random_bits(&random) >> 11) * 0x1p-53;
    state[l] = random.state;
    double square = -2.0 * LN_10 * log10_of_normal(u);
    normal[l] = sqrt(square > 0 ? square : 0) * cosine_of_turn(v);
  }
}

/* --- parameters ------------------------------------------------------------- */

static void fill_unmoved(drawer *d, double *beta)
{
  const mho_molecule *m = d->molecule;
  for (int l = 0; l < L; l++) {
    d->batch.energy_ev[l] = d->fermi_ev;
    beta[l] = m->beta_ev;
  }
  for (int c = 0; c < d->sampler.plan->channels; c++)
    for (int l = 0; l < L; l++) d->batch.coupling[c * L + l] = d->sampler.plan->coupling_ev[c];
  for (int b = 0; b < m->bond_count; b++) {
    double cosine = m->bond[b].twist_deg != 0 ? mho_cos_deg(m->bond[b].twist_deg) : 1;
    for (int l = 0; l < L; l++) d->cosine[b * L + l] = cosine;
  }
}

FOR_EVERY_PROCESSOR
static void turn(double twist_deg, const double *shift, double *cosine)
{
  for (int l = 0; l < L; l++) {
    double turns = (twist_deg + shift[l]) / 360.0;
    cosine[l] = cosine_of_turn(turns - floor(turns));
  }
}

/* Moves one parameter of every lane; beta comes before what it multiplies, and
 * every site and bond has a row of its own. */
static void move(drawer *d, const mho_sensitivity_row *row, const double *shift, double *beta)
{
  const mho_molecule *m = d->molecule;
  int at = row->index;
  double *onsite = d->onsite + at * L, *hopping = d->hopping + at * L, base;
  switch (row->kind) {
  case MHO_PARAMETER_FERMI:
    for (int l = 0; l < L; l++) d->batch.energy_ev[l] += shift[l];
    break;
  case MHO_PARAMETER_BETA:
    for (int l = 0; l < L; l++) beta[l] += shift[l];
    break;
  case MHO_PARAMETER_COUPLING:
    for (int c = 0; c < d->sampler.plan->channels; c++)
      for (int l = 0; l < L; l++)
        if (at == 2 || at == (c < d->sampler.plan->left ? MHO_LEFT : MHO_RIGHT))
          d->batch.coupling[c * L + l] *= exp(shift[l]);
    break;
  case MHO_PARAMETER_H:
    base = mho_parameters_h(m->parameters, m->site[at].row);
    for (int l = 0; l < L; l++) onsite[l] = (base + shift[l]) * beta[l];
    break;
  case MHO_PARAMETER_ONSITE:
    for (int l = 0; l < L; l++) onsite[l] = m->site[at].onsite_ev + shift[l];
    break;
  case MHO_PARAMETER_K:
    base = mho_parameters_k(m->parameters, m->site[m->bond[at].site[0]].row,
                            m->site[m->bond[at].site[1]].row);
    for (int l = 0; l < L; l++) hopping[l] = m->bond[at].strength * (base + shift[l]) * beta[l];
    break;
  case MHO_PARAMETER_HOPPING:
    for (int l = 0; l < L; l++) hopping[l] = m->bond[at].hopping_ev + shift[l];
    break;
  case MHO_PARAMETER_TWIST:
    turn(m->bond[at].twist_deg, shift, d->cosine + at * L);
    break;
  }
}

/* Draws samples first .. first + lanes - 1 into the batch. */
static void draw_batch(drawer *d, size_t first, double *linear, size_t lanes)
{
  const mho_molecule *m = d->molecule;
  double beta[L], shift[L], sum[L] = {0};
  uint64_t state[L];
  for (size_t l = 0; l < L; l++)
    state[l] = mho_random_stream(d->seed, first + (l < lanes ? l : 0)).state;
  fill_unmoved(d, beta);
  for (size_t p = 0; p < d->count; p++) {
    mho_samples_normals(state, shift);
    for (int l = 0; l < L; l++) {
      shift[l] *= d->row[p].sigma;
      sum[l] += d->row[p].derivative_log10_g0 * shift[l];
    }
    move(d, &d->row[p], shift, beta);
  }
  memset(d->batch.value_ev, 0, (size_t)d->sampler.reduction->slots * L * sizeof(double));
  memcpy(d->batch.value_ev, d->onsite, (size_t)m->site_count * L * sizeof(double));
  for (int b = 0; b < m->bond_count; b++)
    for (int l = 0; l < L; l++)
      d->batch.value_ev[d->slot_of_bond[b] * L + l] += d->hopping[b * L + l] * d->cosine[b * L + l];
  for (size_t l = 0; l < lanes; l++) linear[first + l] = sum[l];
}

/* --- thermal averages ------------------------------------------------------- */

/* Both sides of the Fermi level; NaN beyond the lanes that count does no harm. */
static void add_offset(drawer *d, const mho_sample_batch *batch, int lanes, double kt,
                       double weight, double *sum, bool *broken)
{
  double transmission[L];
  mho_sampler_evaluate(&d->sampler, batch, lanes, kt * d->kt_ev, transmission, broken);
  for (int l = 0; l < lanes; l++) sum[l] += weight * transmission[l];
}

/* Both rules by Gauss; good where they agree. */
static void average_gauss(drawer *d, int lanes, double *average, bool *good)
{
  double few[L] = {0};
  bool broken[L] = {false};
  memset(average, 0, L * sizeof *average);
  for (int k = 0; k < SIX; k++)
    add_offset(d, &d->batch, lanes, six[k][0], six[k][1], few, broken);
  for (int k = 0; k < EIGHT; k++)
    add_offset(d, &d->batch, lanes, eight[k][0], eight[k][1], average, broken);
  for (int l = 0; l < lanes; l++)
    good[l] = !broken[l] && fabs(few[l] - average[l]) <= GAUSS_DIFFERENCE * average[l] &&
              average[l] > 0;
}

static void average_cold(drawer *d, int lanes, double *average, bool *good)
{
  bool broken[L] = {false};
  memset(average, 0, L * sizeof *average);
  add_offset(d, &d->batch, lanes, 0, 0.5, average, broken);
  for (int l = 0; l < lanes; l++) good[l] = !broken[l] && average[l] > 0;
}

/* A difference of q c leaves q^2 c after the next halving, of which only one or
 * two are known: q is taken from both, or from c = 1. */
static bool has_converged(double before, double last, double value)
{
  if (!(value > 0)) return false;
  double q = isfinite(before) ? fmin(last / before, 1) : fmin(3 * last / value, 1);
  return last * q <= TOLERANCE * value;
}

/* The trapezoid rule, halved until all lanes stand. */
static void average_trapezoid(drawer *d, double *average, bool *good)
{
  double sum[L] = {0}, last[L];
  bool broken[L] = {false};
  double step = STEP_KT;
  for (int l = 0; l < L; l++) {
    last[l] = average[l] = INFINITY;
    good[l] = false;
  }
  for (int halving = 0; halving <= HALVINGS; halving++, step *= 0.5) {
    int stride = halving ? 2 : 1, from = halving ? 1 : 0, points = (int)(REACH_KT / step);
    for (int k = from; k <= points; k += stride) {
      double f = exp(-k * step), weight = f / ((1 + f) * (1 + f));
      add_offset(d, &d->late, d->late_count, k * step, k ? weight : 0.5 * weight, sum, broken);
    }
    bool all = true;
    for (int l = 0; l < d->late_count; l++) {
      double value = step * sum[l], before = last[l];
      last[l] = fabs(value - average[l]);
      average[l] = value;
      good[l] = !broken[l] && has_converged(before, last[l], value);
      all = all && (good[l] || broken[l]);
    }
    if (all) return;
  }
}

/* --- one sample by all means -------------------------------------------------- */

/* Sample `index` by the molecule's own plan. */
static mho_status draw_alone(drawer *d, size_t index, double *linear)
{
  double *shift = malloc((d->count + 1) * sizeof *shift);
  if (!shift) return mho_fail(d->error, MHO_ERR_MEMORY, "analysis", NULL, "out of memory");
  uint64_t state[L];
  double normal[L];
  for (int l = 0; l < L; l++) state[l] = mho_random_stream(d->seed, index).state;
  linear[index] = 0;
  for (size_t p = 0; p < d->count; p++) {
    mho_samples_normals(state, normal);
    shift[p] = d->row[p].sigma * normal[0];
    linear[index] += d->row[p].derivative_log10_g0 * shift[p];
  }
  mho_status status = mho_perturbed_log10(d->molecule, d->fermi_ev, d->row, d->count, shift,
                                          &d->log10_g0[index], d->error);
  free(shift);
  return status;
}

static mho_status settle_late(drawer *d, double *linear)
{
  double average[L];
  bool good[L];
  mho_status status = MHO_OK;
  if (!d->late_count) return MHO_OK;
  average_trapezoid(d, average, good);
  for (int l = 0; status == MHO_OK && l < d->late_count; l++)
    if (good[l]) d->log10_g0[d->late_index[l]] = log10(average[l]);
    else status = draw_alone(d, d->late_index[l], linear);
  d->late_count = 0;
  return status;
}

static void copy_lane(const double *from, int lane, double *to, int at, size_t numbers)
{
  for (size_t k = 0; k < numbers; k++) to[k * L + (size_t)at] = from[k * L + (size_t)lane];
}

/* A lane joins those that wait. */
static mho_status put_off(drawer *d, int lane, size_t index, double *linear)
{
  int at = d->late_count++;
  copy_lane(d->batch.value_ev, lane, d->late.value_ev, at, (size_t)d->sampler.reduction->slots);
  copy_lane(d->batch.coupling, lane, d->late.coupling, at, (size_t)d->sampler.plan->channels);
  d->late.energy_ev[at] = d->batch.energy_ev[lane];
  d->late_index[at] = index;
  return d->late_count == L ? settle_late(d, linear) : MHO_OK;
}

static mho_status draw_lanes(drawer *d, size_t first, size_t end, double *linear)
{
  mho_status status = MHO_OK;
  bool cold = d->kt_ev < MHO_COLD_EV;
  for (size_t i = first; status == MHO_OK && i < end; i += L) {
    size_t lanes = end - i < L ? end - i : L;
    double average[L];
    bool good[L];
    draw_batch(d, i, linear, lanes);
    if (cold) average_cold(d, (int)lanes, average, good);
    else average_gauss(d, (int)lanes, average, good);
    for (size_t l = 0; status == MHO_OK && l < lanes; l++)
      if (good[l]) d->log10_g0[i + l] = log10(average[l]);
      else status = cold ? draw_alone(d, i + l, linear) : put_off(d, (int)l, i + l, linear);
  }
  return status == MHO_OK ? settle_late(d, linear) : status;
}

/* --- all ---------------------------------------------------------------------- */

/* False where some bond has no number, as its hopping is zero. */
static bool find_bonds(drawer *d)
{
  const mho_molecule *m = d->molecule;
  for (int b = 0; b < m->bond_count; b++) {
    const int *end = m->bond[b].site;
    d->slot_of_bond[b] = mho_reduction_find(d->sampler.reduction, end[0], end[1]);
    if (d->slot_of_bond[b] < 0 || mho_molecule_hopping_ev(m, b) == 0) return false;
  }
  return true;
}

static void clear(drawer *d)
{
  mho_sampler_clear(&d->sampler);
  mho_sample_batch_clear(&d->batch);
  mho_sample_batch_clear(&d->late);
  free(d->slot_of_bond);
  free(d->onsite);
}

static mho_status init(drawer *d, const mho_plan *plan)
{
  size_t sites = (size_t)d->molecule->site_count, bonds = (size_t)d->molecule->bond_count;
  mho_status status = mho_sampler_init(plan, &d->sampler);
  if (status == MHO_OK && !d->sampler.reduction) return MHO_OK;
  if (status == MHO_OK) status = mho_sample_batch_init(&d->sampler, &d->batch);
  if (status == MHO_OK) status = mho_sample_batch_init(&d->sampler, &d->late);
  d->slot_of_bond = malloc((bonds + 1) * sizeof(int));
  d->onsite = malloc((sites + 2 * bonds + 1) * L * sizeof(double));
  if (status != MHO_OK || !d->slot_of_bond || !d->onsite)
    return mho_fail(d->error, MHO_ERR_MEMORY, "analysis", NULL, "out of memory");
  d->hopping = d->onsite + sites * L;
  d->cosine = d->hopping + bonds * L;
  return MHO_OK;
}

mho_status mho_samples_draw(const mho_molecule *molecule, const mho_plan *plan, double fermi_ev,
                            const mho_sensitivity_row *row, size_t count, uint64_t seed,
                            size_t first, size_t end, double *value, double *linear,
                            mho_error *error)
{
  drawer d = {.molecule = molecule,
              .row = row,
              .count = count,
              .fermi_ev = fermi_ev,
              .kt_ev = MHO_BOLTZMANN_EV_PER_K * molecule->temperature_k,
              .seed = seed,
              .log10_g0 = value,
              .error = error};
  bool never = !plan->connected;
  for (int b = 0; b < molecule->bond_count; b++)
    never = never && mho_molecule_hopping_ev(molecule, b) != 0;
  mho_status status = init(&d, plan);
  if (status == MHO_OK && d.sampler.reduction && find_bonds(&d))
    status = draw_lanes(&d, first, end, linear);
  else
    for (size_t i = first; status == MHO_OK && i < end; i++)
      if (never) { /* no shift joins the contacts */
        value[i] = -INFINITY;
        linear[i] = 0;
      } else status = draw_alone(&d, i, linear);
  clear(&d);
  return status;
}
