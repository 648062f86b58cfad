/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What the methods share: non-zeros of H, channels, a narrow order of the
 * sites, and the orbitals' amplitudes on the contacts where that is worth it.
 */
#include "solver/plan.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "solver/program.h"
#include "solver/repeat.h"
#include "solver/rows.h"

/* Smaller molecules are as fast without a compiled elimination, and longer ones of
 * equal units faster. */
enum { PROGRAM_SITES_MIN = 4, REPEAT_ALONE = 20000 };

static mho_status collect_entries(const mho_junction *junction, mho_plan *plan)
{
  size_t n = (size_t)junction->sites, count = 0;
  const double *h = junction->hamiltonian_ev;
  for (size_t i = 0; i < n; i++)
    for (size_t j = i; j < n; j++) count += h[i * n + j] != 0.0;
  plan->entry = malloc((count ? count : 1) * sizeof *plan->entry);
  if (!plan->entry) return MHO_ERR_MEMORY;
  for (size_t i = 0; i < n; i++)
    for (size_t j = i; j < n; j++)
      if (h[i * n + j] != 0.0)
        plan->entry[plan->entries++] = (mho_entry){(int)i, (int)j, h[i * n + j]};
  return MHO_OK;
}

static mho_status collect_support(mho_plan *plan)
{
  size_t n = (size_t)plan->sites, m = (size_t)plan->channels, count = 0;
  for (size_t k = 0; k < m * n; k++) count += plan->vector[k] != 0.0;
  plan->support = malloc((count ? count : 1) * sizeof(int));
  plan->support_start = malloc((m + 1) * sizeof(size_t));
  if (!plan->support || !plan->support_start) return MHO_ERR_MEMORY;
  count = 0;
  for (size_t c = 0; c < m; c++) {
    plan->support_start[c] = count;
    for (size_t i = 0; i < n; i++)
      if (plan->vector[c * n + i] != 0.0) plan->support[count++] = (int)i;
  }
  plan->support_start[m] = count;
  return MHO_OK;
}

static mho_status collect_channels(const mho_lead *const lead[2], mho_plan *plan)
{
  size_t n = (size_t)plan->sites, first = 0;
  plan->left = lead[MHO_LEFT]->channels;
  plan->right = lead[MHO_RIGHT]->channels;
  plan->channels = plan->left + plan->right;
  size_t m = (size_t)plan->channels;
  plan->coupling_ev = malloc(m * sizeof(double));
  plan->shift_ev = malloc(m * sizeof(double));
  plan->vector = malloc(m * n * sizeof(double));
  if (!plan->coupling_ev || !plan->shift_ev || !plan->vector) return MHO_ERR_MEMORY;
  for (int side = 0; side < 2; side++) {
    size_t count = (size_t)lead[side]->channels;
    memcpy(plan->coupling_ev + first, lead[side]->coupling_ev, count * sizeof(double));
    memcpy(plan->shift_ev + first, lead[side]->shift_ev, count * sizeof(double));
    memcpy(plan->vector + first * n, lead[side]->vector, count * n * sizeof(double));
    plan->has_chain[side] = lead[side]->chain != NULL;
    if (lead[side]->chain) plan->chain[side] = *lead[side]->chain;
    first += count;
  }
  return collect_support(plan);
}

/* Calls back once for each ordered pair of sites that H or Sigma joins:
 * counts them, or with `fill` stores them at neighbour_start, which moves on. */
static void add_neighbour(mho_plan *plan, int i, int j, bool fill)
{
  if (i == j) return;
  if (fill) plan->neighbour[plan->neighbour_start[i]++] = j;
  else plan->neighbour_start[i + 1]++;
}

static void walk_pattern(mho_plan *plan, bool fill)
{
  for (size_t e = 0; e < plan->entries; e++) {
    if (plan->entry[e].value_ev == 0.0) continue;
    add_neighbour(plan, plan->entry[e].i, plan->entry[e].j, fill);
    add_neighbour(plan, plan->entry[e].j, plan->entry[e].i, fill);
  }
  for (int c = 0; c < plan->channels; c++)
    for (size_t a = plan->support_start[c]; a < plan->support_start[c + 1]; a++)
      for (size_t b = plan->support_start[c]; b < plan->support_start[c + 1]; b++)
        add_neighbour(plan, plan->support[a], plan->support[b], fill);
}

static mho_status collect_neighbours(mho_plan *plan)
{
  size_t n = (size_t)plan->sites;
  plan->neighbour_start = calloc(n + 2, sizeof(size_t));
  if (!plan->neighbour_start) return MHO_ERR_MEMORY;
  walk_pattern(plan, false);
  for (size_t i = 0; i < n; i++) plan->neighbour_start[i + 1] += plan->neighbour_start[i];
  plan->neighbour = malloc((plan->neighbour_start[n] + 1) * sizeof(int));
  if (!plan->neighbour) return MHO_ERR_MEMORY;
  walk_pattern(plan, true); /* every start now stands at its end */
  memmove(plan->neighbour_start + 1, plan->neighbour_start, n * sizeof(size_t));
  plan->neighbour_start[0] = 0;
  return MHO_OK;
}

/* True if some chain of hoppings leads from the left to the right contact. */
static mho_status find_connection(mho_plan *plan)
{
  size_t n = (size_t)plan->sites, head = 0, tail = 0;
  size_t right = plan->support_start[plan->left], all = plan->support_start[plan->channels];
  int *queue = malloc(n * sizeof(int));
  bool *reached = calloc(n, sizeof(bool));
  if (queue && reached) {
    for (size_t k = 0; k < right; k++)
      if (!reached[plan->support[k]]) reached[queue[tail++] = plan->support[k]] = true;
    for (; head < tail; head++)
      for (size_t k = plan->neighbour_start[queue[head]];
           k < plan->neighbour_start[queue[head] + 1]; k++)
        if (!reached[plan->neighbour[k]]) reached[queue[tail++] = plan->neighbour[k]] = true;
    for (size_t k = right; k < all; k++) plan->connected |= reached[plan->support[k]];
  }
  mho_status status = queue && reached ? MHO_OK : MHO_ERR_MEMORY;
  free(queue);
  free(reached);
  return status;
}

static mho_status make_room_for_levels(mho_plan *plan)
{
  size_t n = (size_t)plan->sites, m = (size_t)plan->channels;
  plan->level_ev = malloc(n * sizeof(double));
  plan->amplitude = malloc(n * m * sizeof(double));
  bool pair = plan->left == 1 && plan->right == 1;
  if (pair) plan->pair = malloc(n * sizeof *plan->pair);
  return plan->level_ev && plan->amplitude && (plan->pair || !pair) ? MHO_OK : MHO_ERR_MEMORY;
}

/* What follows from levels and amplitudes. */
static void finish_levels(mho_plan *plan)
{
  int n = plan->sites;
  plan->norm_ev = fmax(fabs(plan->level_ev[0]), fabs(plan->level_ev[n - 1]));
  for (int k = 0; plan->pair && k < n; k++) {
    double w0 = plan->amplitude[2 * k], w1 = plan->amplitude[2 * k + 1];
    plan->pair[k] = (mho_pole_pair){plan->level_ev[k], w0 * w0, w0 * w1, w1 * w1};
  }
}

/* <orbital k|v_c> for all levels and channels. */
static mho_status project_orbitals(const mho_junction *junction, mho_plan *plan)
{
  size_t n = (size_t)junction->sites, m = (size_t)plan->channels;
  mho_status status = make_room_for_levels(plan);
  if (status != MHO_OK) return status;
  memcpy(plan->level_ev, junction->level_ev, n * sizeof(double));
  for (size_t k = 0; k < n; k++)
    for (size_t c = 0; c < m; c++) {
      double sum = 0;
      for (size_t a = plan->support_start[c]; a < plan->support_start[c + 1]; a++) {
        size_t i = (size_t)plan->support[a];
        sum += junction->orbital[k * n + i] * plan->vector[c * n + i];
      }
      plan->amplitude[k * m + c] = sum;
    }
  finish_levels(plan);
  return MHO_OK;
}

/* The same without a diagonalised junction, where that is worth it. */
static mho_status find_levels(mho_plan *plan)
{
  bool pair = plan->left == 1 && plan->right == 1;
  if (!pair || plan->sites > SPECTRUM_SITES_MAX) return MHO_OK;
  mho_status status = make_room_for_levels(plan);
  if (status != MHO_OK) return status;
  if (mho_rows_diagonalise(plan, plan->level_ev, (double(*)[2])plan->amplitude)) {
    finish_levels(plan);
  } else {
    free(plan->pair);
    free(plan->amplitude);
    free(plan->level_ev);
    plan->pair = NULL;
    plan->amplitude = plan->level_ev = NULL;
  }
  return MHO_OK;
}

/* Largest sum of |H_ij| over a row bounds the 2-norm. */
static mho_status bound_norm(mho_plan *plan)
{
  double *row = calloc((size_t)plan->sites, sizeof(double));
  if (!row) return MHO_ERR_MEMORY;
  for (size_t e = 0; e < plan->entries; e++) {
    double size = fabs(plan->entry[e].value_ev);
    row[plan->entry[e].i] += size;
    if (plan->entry[e].i != plan->entry[e].j) row[plan->entry[e].j] += size;
  }
  for (int i = 0; i < plan->sites; i++) plan->norm_ev = fmax(plan->norm_ev, row[i]);
  free(row);
  return MHO_OK;
}

static mho_status start(int sites, const mho_lead *left, const mho_lead *right,
                        mho_plan **plan, mho_error *error)
{
  *plan = NULL;
  if (!left->channels || !right->channels)
    return mho_fail(error, MHO_ERR_CONTACTS, "solver", "electrodes",
                    "transmission needs a left and a right contact");
  for (int side = 0; side < 2; side++) {
    const mho_chain_electrode *chain = (side == MHO_LEFT ? left : right)->chain;
    if (chain && !(isfinite(chain->center_ev) && isfinite(chain->joint_ev) &&
                   isfinite(1 / chain->hopping_ev) && chain->hopping_ev != 0))
      return mho_fail(error, MHO_ERR_RANGE, "solver", "electrodes",
                      "a chain electrode needs finite energies and a hopping that is not 0");
  }
  *plan = calloc(1, sizeof **plan);
  if (!*plan) return mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  (*plan)->sites = sites;
  return MHO_OK;
}

static mho_status arrange(const mho_lead *left, const mho_lead *right, mho_plan *plan)
{
  mho_status status = collect_channels((const mho_lead *const[]){left, right}, plan);
  if (status == MHO_OK) status = collect_neighbours(plan);
  if (status == MHO_OK) status = find_connection(plan);
  if (status == MHO_OK) status = mho_plan_order(plan);
  return status;
}

/* Everything that follows from entries and leads. */
static mho_status prepare(const mho_lead *left, const mho_lead *right, mho_plan *plan)
{
  mho_status status = mho_spare_create(plan);
  if (status == MHO_OK) status = arrange(left, right, plan);
  if (status == MHO_OK) status = mho_repeat_create(plan, &plan->repeat);
  bool compile = plan->sites >= PROGRAM_SITES_MIN &&
                 !(plan->repeat && plan->sites > REPEAT_ALONE);
  if (status == MHO_OK && compile) status = mho_program_create(plan, &plan->program);
  if (status == MHO_OK && plan->program)
    status = mho_plan_contacts(plan, plan->program->kept_site, plan->program->kept,
                               &plan->contacts);
  return status;
}

mho_status mho_plan_contacts(const mho_plan *plan, const int *site, int count,
                             mho_plan **contacts)
{
  size_t n = (size_t)count, m = (size_t)plan->channels;
  mho_plan *p = *contacts = calloc(1, sizeof *p);
  if (!p) return MHO_ERR_MEMORY;
  p->sites = count;
  p->left = plan->left;
  p->right = plan->right;
  p->channels = plan->channels;
  p->coupling_ev = malloc(m * sizeof(double));
  p->shift_ev = malloc(m * sizeof(double));
  p->vector = malloc(m * n * sizeof(double));
  if (!p->coupling_ev || !p->shift_ev || !p->vector) return MHO_ERR_MEMORY;
  memcpy(p->coupling_ev, plan->coupling_ev, m * sizeof(double));
  memcpy(p->shift_ev, plan->shift_ev, m * sizeof(double));
  for (size_t c = 0; c < m; c++)
    for (size_t i = 0; i < n; i++)
      p->vector[c * n + i] = plan->vector[c * (size_t)plan->sites + (size_t)site[i]];
  return collect_support(p);
}

static mho_status finish(mho_status status, mho_plan **plan, mho_error *error)
{
  if (status == MHO_OK) return MHO_OK;
  mho_plan_free(*plan);
  *plan = NULL;
  return mho_fail(error, status, "solver", NULL, "out of memory");
}

static mho_status create(const mho_junction *junction, bool sweeps, mho_plan **plan,
                         mho_error *error)
{
  const mho_lead *left = &junction->lead[MHO_LEFT], *right = &junction->lead[MHO_RIGHT];
  mho_status status = start(junction->sites, left, right, plan, error);
  if (status != MHO_OK) return status;
  status = collect_entries(junction, *plan);
  if (status == MHO_OK)
    status = sweeps ? prepare(left, right, *plan) : arrange(left, right, *plan);
  if (status == MHO_OK) status = project_orbitals(junction, *plan);
  return finish(status, plan, error);
}

mho_status mho_plan_create(const mho_junction *junction, mho_plan **plan, mho_error *error)
{
  return create(junction, true, plan, error);
}

mho_status mho_plan_create_bare(const mho_junction *junction, mho_plan **plan, mho_error *error)
{
  return create(junction, false, plan, error);
}

static mho_status check_entries(int sites, const mho_entry *entry, size_t entries,
                                mho_error *error)
{
  for (size_t e = 0; e < entries; e++) {
    if (entry[e].i < 0 || entry[e].i > entry[e].j || entry[e].j >= sites)
      return mho_fail(error, MHO_ERR_SIZE, "solver", "entry",
                      "entry %zu joins sites %d and %d; allowed are 0 <= i <= j < %d", e,
                      entry[e].i, entry[e].j, sites);
    if (!isfinite(entry[e].value_ev))
      return mho_fail(error, MHO_ERR_NOT_FINITE, "solver", "entry",
                      "entry %zu is not a finite number", e);
  }
  return MHO_OK;
}

mho_status mho_plan_create_sparse(int sites, const mho_entry *entry, size_t entries,
                                  const mho_lead *left, const mho_lead *right,
                                  mho_plan **plan, mho_error *error)
{
  *plan = NULL;
  mho_status status = check_entries(sites, entry, entries, error);
  if (status == MHO_OK) status = start(sites, left, right, plan, error);
  if (status != MHO_OK) return status;
  (*plan)->entry = malloc((entries ? entries : 1) * sizeof *entry);
  (*plan)->entries = entries;
  if (!(*plan)->entry) return finish(MHO_ERR_MEMORY, plan, error);
  if (entries) memcpy((*plan)->entry, entry, entries * sizeof *entry);
  status = prepare(left, right, *plan);
  if (status == MHO_OK) status = bound_norm(*plan);
  if (status == MHO_OK) status = find_levels(*plan);
  return finish(status, plan, error);
}

void mho_plan_free(mho_plan *plan)
{
  if (!plan) return;
  free(plan->entry);
  free(plan->coupling_ev);
  free(plan->shift_ev);
  free(plan->vector);
  free(plan->support);
  free(plan->support_start);
  free(plan->neighbour);
  free(plan->neighbour_start);
  free(plan->order);
  free(plan->place);
  free(plan->level_ev);
  free(plan->amplitude);
  free(plan->pair);
  mho_repeat_free(plan->repeat);
  mho_program_free(plan->program);
  mho_plan_free(plan->contacts);
  mho_spare_free(plan);
  free(plan);
}

int mho_plan_sites(const mho_plan *plan) { return plan->sites; }

int mho_plan_channels(const mho_plan *plan)
{
  return plan->left < plan->right ? plan->left : plan->right;
}

static const char *describe_program(const mho_plan *plan, char *buffer, size_t size)
{
  if (plan->program)
    snprintf(buffer, size, "compiled sparse elimination of %zu of %d sites", plan->program->steps,
             plan->sites);
  else
    snprintf(buffer, size, "no compiled elimination, as %s",
             plan->sites < PROGRAM_SITES_MIN ? "so few sites do not need it"
             : plan->repeat                  ? "equal units are quicker"
                                             : "it would fill the matrix");
  return buffer;
}

const char *mho_plan_describe(const mho_plan *plan, char *buffer, size_t size)
{
  char levels[120] = "no sum over levels, as the molecule was not diagonalised";
  char program[120], repeat[80] = "", band[80] = "pivoted elimination of the full matrix";
  if (plan->level_ev)
    snprintf(levels, sizeof levels, "sum over %d levels", plan->sites);
  if (plan->level_ev && plan->program && plan->sites > SPECTRUM_SITES_MAX)
    snprintf(levels, sizeof levels, "no sum over levels, as few energies of %d would be exact enough",
             plan->sites);
  if (plan->repeat)
    snprintf(repeat, sizeof repeat, "; doubling of %d equal units of %d sites", plan->repeat->units,
             plan->repeat->unit);
  if (plan->band)
    snprintf(band, sizeof band, "pivoted elimination within a band of %zu of %d sites", plan->band,
             plan->sites);
  snprintf(buffer, size, "%s; %s%s; %s%s", levels, describe_program(plan, program, sizeof program),
           repeat, band,
           mho_plan_has_chain(plan) ? "; Gamma and shift of the chains anew at every energy" : "");
  return buffer;
}
