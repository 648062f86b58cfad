/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The ladder of methods: the first that keeps the accuracy contract is taken.
 */
#include <math.h>
#include <stdatomic.h>
#include <stdlib.h>

#include "solver/bare.h"
#include "solver/logarithm.h"
#include "solver/plan.h"
#include "solver/program.h"
#include "solver/repeat.h"
#include "solver/spectrum.h"

/* The accuracy contract: max(FLOOR, 64 u kappa), and beyond CEILING the point
 * is done again in extended precision. */
#define CONTRACT_FLOOR 1e-12
#define CONTRACT_CEILING 1e-10
#define CONTRACT_KAPPA (64.0 * UNIT_ROUNDOFF)

/* Room for what a first-order bound leaves out: with the pivots that the program
 * trusts and a bound below CONTRACT_CEILING that is far less. */
#define SECOND_ORDER 1.05

/* Smaller molecules are as quick in 113 bits throughout. */
enum { REFINED_SITES_MIN = 24 };

enum { KEPT_SQUARE = PROGRAM_KEPT_MAX * PROGRAM_KEPT_MAX };

/* Energies that wait until all lanes of the program are taken. */
typedef struct {
  double energy_ev[PROGRAM_LANES];
  size_t at[PROGRAM_LANES]; /* which point a lane belongs to */
  size_t lanes;
} queue;

/* What one thread needs besides the plan; all but the queue only on demand. */
typedef struct {
  mho_elimination_double *plain, *reduced;
  mho_elimination_quad *extended, *reduced_extended, *repeated;
  mho_bare *refined;
  mho_program_trace trace;
  queue queue; /* for the program */
} workspace;

struct mho_spare {
  _Atomic(workspace *) waiting;
};

static void workspace_free(workspace *work)
{
  if (!work) return;
  mho_elimination_free_double(work->plain);
  mho_elimination_free_double(work->reduced);
  mho_elimination_free_quad(work->extended);
  mho_elimination_free_quad(work->reduced_extended);
  mho_elimination_free_quad(work->repeated);
  mho_bare_free(work->refined);
  mho_program_trace_clear(&work->trace);
  free(work);
}

mho_status mho_spare_create(mho_plan *plan)
{
  plan->spare = malloc(sizeof *plan->spare);
  if (!plan->spare) return MHO_ERR_MEMORY;
  atomic_init(&plan->spare->waiting, NULL);
  return MHO_OK;
}

void mho_spare_free(mho_plan *plan)
{
  if (plan->spare) workspace_free(atomic_load(&plan->spare->waiting));
  free(plan->spare);
}

/* The waiting workspace, or a new one; several sweeps at a time have one each. */
static workspace *workspace_take(const mho_plan *plan)
{
  workspace *work = atomic_exchange(&plan->spare->waiting, NULL);
  return work ? work : calloc(1, sizeof *work);
}

/* A workspace of a sweep that failed may hold anything and is not kept. */
static void workspace_return(const mho_plan *plan, workspace *work, bool keep)
{
  workspace_free(keep ? atomic_exchange(&plan->spare->waiting, work) : work);
}

static void set_point(const mho_plan *plan, const mho_estimate *estimate,
                      mho_method method, mho_point *point)
{
  double most = plan->left < plan->right ? plan->left : plan->right;
  *point = (mho_point){.transmission = estimate->transmission,
                       .log10_transmission = estimate->log10_transmission,
                       .relative_error = estimate->relative_error,
                       .method = method};
  if (point->transmission > most) {
    point->transmission = most;
    point->log10_transmission = log10(most);
  }
}

static bool keeps_contract(const mho_estimate *estimate)
{
  double error = estimate->relative_error;
  return estimate->first_order &&
         (error <= CONTRACT_FLOOR ||
          (error <= CONTRACT_KAPPA * estimate->kappa && error <= CONTRACT_CEILING));
}

/* The last rung: what 113 bits cannot tell from zero is a node. */
static void set_extended(const mho_plan *plan, const mho_estimate *estimate,
                         mho_point *point)
{
  set_point(plan, estimate, MHO_METHOD_EXTENDED, point);
  if (estimate->relative_error > 0.5 && !(estimate->transmission > 1e-20)) {
    *point = (mho_point){.node = true, .method = MHO_METHOD_EXTENDED};
    return;
  }
  point->unresolved =
      !estimate->first_order || !(estimate->relative_error <= CONTRACT_CEILING);
  if (!isfinite(point->relative_error)) point->relative_error = 1.0;
}

/* T of one lane from its Schur complement: in double, where the low parts count
 * as error, and if that is not good enough in 113 bits; sets the adjoints. */
static mho_status reduced_point(const mho_plan *plan, workspace *work, size_t lane,
                                mho_estimate *estimate)
{
  const mho_program *program = plan->program;
  size_t n = (size_t)program->kept;
  double value[KEPT_SQUARE] = {0}, low[KEPT_SQUARE] = {0}, adjoint[KEPT_SQUARE] = {0};
  for (size_t k = 0; k < n * n; k++) {
    int slot = program->kept_slot[k / n][k % n];
    if (slot < 0) continue;
    value[k] = PROGRAM_NUMBER(&work->trace, slot)[lane];
    low[k] = PROGRAM_NUMBER(&work->trace, slot)[work->trace.lanes + (int)lane];
  }
  if (!work->reduced) work->reduced = mho_elimination_create_double(plan->contacts);
  if (!work->reduced) return MHO_ERR_MEMORY;
  mho_elimination_reduced_double(plan->contacts, work->reduced, value, adjoint, estimate);
  for (size_t k = 0; k < n * n; k++)
    if (k % n <= k / n) estimate->relative_error += fabs(adjoint[k] * low[k]);
  if (!keeps_contract(estimate)) {
    mho_quad exact[KEPT_SQUARE];
    for (size_t k = 0; k < n * n; k++) exact[k] = (mho_quad)value[k] + low[k];
    if (!work->reduced_extended)
      work->reduced_extended = mho_elimination_create_quad(plan->contacts);
    if (!work->reduced_extended) return MHO_ERR_MEMORY;
    mho_elimination_reduced_quad(plan->contacts, work->reduced_extended, exact, adjoint, estimate);
  }
  for (size_t k = 0; k < n * n; k++)
    work->trace.adjoint[k * PROGRAM_LANES + lane] = adjoint[k];
  return MHO_OK;
}

/* T of all lanes and the adjoints of the Schur complements. */
static mho_status finish_lanes(const mho_plan *plan, workspace *work, size_t lanes,
                               mho_estimate *estimate)
{
  double transmission[PROGRAM_LANES], error[PROGRAM_LANES];
  bool pair = mho_program_is_pair(plan);
  if (pair) mho_program_finish_pair(plan, &work->trace, transmission, error);
  for (size_t l = 0; l < lanes; l++) {
    estimate[l] = (mho_estimate){.relative_error = INFINITY};
    if (work->trace.broken[l]) continue;
    if (pair && transmission[l] > 1e-200 && error[l] <= CONTRACT_FLOOR)
      estimate[l] = (mho_estimate){.transmission = transmission[l],
                                   .log10_transmission = log10_of_normal(transmission[l]),
                                   .relative_error = error[l],
                                   .first_order = true};
    else {
      mho_status status = reduced_point(plan, work, l, &estimate[l]);
      if (status != MHO_OK) return status;
    }
  }
  return MHO_OK;
}

/* Contacts of one site each, and not so small that 113 bits cost nothing. */
static bool refines(const mho_plan *plan)
{
  if (plan->sites < REFINED_SITES_MIN || plan->channels != 2 || plan->support_start[2] != 2)
    return false;
  return fabs(plan->vector[plan->support[0]]) == 1 &&
         fabs(plan->vector[plan->sites + plan->support[1]]) == 1;
}

/* One energy by doubling of units if there are any, then by pivoted elimination in
 * double, the same refined, and in 113 bits. */
static mho_status eliminate(const mho_plan *plan, workspace *work, double energy_ev,
                            mho_point *point)
{
  mho_estimate estimate;
  if (plan->repeat && plan->first <= MHO_METHOD_REPEAT) {
    if (!work->repeated) work->repeated = mho_elimination_create_quad(plan->repeat->plan);
    if (!work->repeated) return MHO_ERR_MEMORY;
    mho_repeat_evaluate(plan->repeat, work->repeated, energy_ev, &estimate);
    if (keeps_contract(&estimate)) {
      set_point(plan, &estimate, MHO_METHOD_REPEAT, point);
      return MHO_OK;
    }
  }
  if (plan->first <= MHO_METHOD_ELIMINATION) {
    if (!work->plain) work->plain = mho_elimination_create_double(plan);
    if (!work->plain) return MHO_ERR_MEMORY;
    mho_elimination_evaluate_double(plan, work->plain, energy_ev, &estimate);
    if (keeps_contract(&estimate)) {
      set_point(plan, &estimate, MHO_METHOD_ELIMINATION, point);
      return MHO_OK;
    }
  }
  if (plan->first <= MHO_METHOD_REFINED && refines(plan)) {
    if (!work->refined) work->refined = mho_bare_create(plan);
    if (!work->refined) return MHO_ERR_MEMORY;
    mho_bare_transmission(work->refined, plan, energy_ev, &estimate);
    if (estimate.relative_error <= CONTRACT_FLOOR) {
      set_point(plan, &estimate, MHO_METHOD_REFINED, point);
      return MHO_OK;
    }
  }
  if (!work->extended) work->extended = mho_elimination_create_quad(plan);
  if (!work->extended) return MHO_ERR_MEMORY;
  mho_elimination_evaluate_quad(plan, work->extended, energy_ev, &estimate);
  set_extended(plan, &estimate, point);
  return MHO_OK;
}

/* Runs the program on the energies that wait for it. */
static mho_status run_program(const mho_plan *plan, workspace *work, mho_point *point)
{
  mho_program_trace *trace = &work->trace;
  queue *wait = &work->queue;
  size_t lanes = wait->lanes;
  wait->lanes = 0;
  if (!lanes) return MHO_OK;
  for (size_t l = lanes; l < PROGRAM_LANES; l++) wait->energy_ev[l] = wait->energy_ev[0];
  if (!trace->number && mho_program_trace_create(plan->program, trace) != MHO_OK)
    return MHO_ERR_MEMORY;
  mho_program_forward(plan->program, wait->energy_ev, lanes, plan->norm_ev, trace);
  mho_estimate estimate[PROGRAM_LANES];
  mho_status status = finish_lanes(plan, work, lanes, estimate);
  if (status == MHO_OK) mho_program_backward(plan->program, wait->energy_ev, trace);
  for (size_t l = 0; status == MHO_OK && l < lanes; l++) {
    estimate[l].relative_error += SECOND_ORDER * trace->error[l];
    if (keeps_contract(&estimate[l]))
      set_point(plan, &estimate[l], MHO_METHOD_SPARSE, &point[wait->at[l]]);
    else status = eliminate(plan, work, wait->energy_ev[l], &point[wait->at[l]]);
  }
  return status;
}

/* An energy that the sum over levels could not settle. */
static mho_status pass_on(const mho_plan *plan, workspace *work, double energy_ev, size_t index,
                          mho_point *point)
{
  if (!plan->program || plan->first > MHO_METHOD_SPARSE)
    return eliminate(plan, work, energy_ev, &point[index]);
  queue *wait = &work->queue;
  wait->energy_ev[wait->lanes] = energy_ev;
  wait->at[wait->lanes++] = index;
  return wait->lanes == (size_t)plan->program->lanes ? run_program(plan, work, point) : MHO_OK;
}

/* One energy by the sum over levels, for any number of channels. */
static mho_status sum_levels(const mho_plan *plan, workspace *work, double energy_ev, size_t index,
                             mho_point *point)
{
  mho_estimate estimate;
  mho_spectrum_evaluate(plan, energy_ev, &estimate);
  if (!keeps_contract(&estimate)) return pass_on(plan, work, energy_ev, index, point);
  set_point(plan, &estimate, MHO_METHOD_SPECTRUM, &point[index]);
  return MHO_OK;
}

static double at_most(double x, double most) { return x < most ? x : most; }

/* Up to SPECTRUM_LANES energies, the first of them point[first]'s. */
static mho_status sum_levels_of_pair(const mho_plan *plan, workspace *work, const double *energy_ev,
                                     size_t first, size_t count, mho_point *point)
{
  mho_spectrum_batch batch;
  double lane[SPECTRUM_LANES];
  for (size_t l = 0; l < SPECTRUM_LANES; l++) lane[l] = energy_ev[l < count ? l : 0];
  mho_spectrum_evaluate_pair(plan, lane, &batch);
  mho_status status = MHO_OK;
  for (size_t l = 0; status == MHO_OK && l < count; l++)
    if (batch.relative_error[l] <= CONTRACT_FLOOR)
      point[first + l] = (mho_point){.transmission = at_most(batch.transmission[l], 1),
                                     .log10_transmission = at_most(batch.log10_transmission[l], 0),
                                     .relative_error = batch.relative_error[l],
                                     .method = MHO_METHOD_SPECTRUM};
    else status = pass_on(plan, work, lane[l], first + l, point);
  return status;
}

static mho_status sweep_wide_band(const mho_plan *plan, workspace *work, size_t count,
                        const double *energy_ev, mho_point *point)
{
  mho_status status = MHO_OK;
  for (size_t i = 0; !plan->connected && i < count; i++)
    point[i] = (mho_point){.node = true, .method = MHO_METHOD_NO_PATH};
  if (!plan->connected) return MHO_OK;
  bool levels = plan->level_ev && plan->first <= MHO_METHOD_SPECTRUM &&
                (!plan->program || plan->sites <= SPECTRUM_SITES_MAX);
  size_t lanes = levels && plan->pair ? SPECTRUM_LANES : 1;
  for (size_t i = 0; status == MHO_OK && i < count; i += lanes)
    if (!levels) status = pass_on(plan, work, energy_ev[i], i, point);
    else if (!plan->pair) status = sum_levels(plan, work, energy_ev[i], i, point);
    else status = sum_levels_of_pair(plan, work, energy_ev + i, i,
                                     count - i < lanes ? count - i : lanes, point);
  return status == MHO_OK ? run_program(plan, work, point) : status;
}

/* With chains as electrodes every energy has its own Gamma and shift. */
static mho_status sweep_chains(const mho_plan *plan, workspace *work, size_t count,
                               const double *energy_ev, mho_point *point)
{
  mho_frozen frozen;
  mho_status status = mho_frozen_create(plan, &frozen);
  for (size_t i = 0; status == MHO_OK && i < count; i++)
    if (mho_frozen_set(plan, energy_ev[i], &frozen))
      status = sweep_wide_band(&frozen.plan, work, 1, energy_ev + i, point + i);
    else point[i] = (mho_point){.node = true, .method = MHO_METHOD_NO_BAND};
  mho_frozen_clear(&frozen);
  return status;
}

static mho_status sweep(const mho_plan *plan, workspace *work, size_t count,
                        const double *energy_ev, mho_point *point)
{
  return (mho_plan_has_chain(plan) ? sweep_chains : sweep_wide_band)(plan, work, count, energy_ev,
                                                                     point);
}

mho_status mho_transmission_sweep(const mho_plan *plan, size_t count,
                                  const double *energy_ev, mho_point *point,
                                  mho_error *error)
{
  for (size_t i = 0; i < count; i++)
    if (!isfinite(energy_ev[i]))
      return mho_fail(error, MHO_ERR_NOT_FINITE, "solver", "energy",
                      "energy %zu is not a finite number", i);
  workspace *work = workspace_take(plan);
  mho_status status = work ? sweep(plan, work, count, energy_ev, point) : MHO_ERR_MEMORY;
  if (work) workspace_return(plan, work, status == MHO_OK);
  return status == MHO_OK ? MHO_OK : mho_fail(error, status, "solver", NULL, "out of memory");
}

const char *mho_method_name(mho_method method)
{
  static const char *const name[MHO_METHOD_COUNT] = {
      [MHO_METHOD_NO_PATH] = "no path joins the contacts",
      [MHO_METHOD_NO_BAND] = "outside the band of an electrode",
      [MHO_METHOD_SPECTRUM] = "sum over levels",
      [MHO_METHOD_SPARSE] = "compiled sparse elimination in 106 bits",
      [MHO_METHOD_REPEAT] = "doubling of equal units in 113 bits",
      [MHO_METHOD_ELIMINATION] = "pivoted elimination",
      [MHO_METHOD_REFINED] = "pivoted elimination, refined in 113 bits",
      [MHO_METHOD_EXTENDED] = "pivoted elimination in 113 bits"};
  return method >= 0 && method < MHO_METHOD_COUNT ? name[method] : "unknown";
}
