/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <mho/conductance.h>
#include <mho/constants.h>
#include <mho/modify.h>

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "analysis/perturb.h"
#include "analysis/site_change.h"
#include "analysis/thermal.h"

enum { LEVELS = 101, MIDDLE = LEVELS / 2, GROWTH = 2 };

/* Mesomeric groups by the rows of the parameter set; methyl by its inductive
 * effect, h of the carbon -0.5: A. Streitwieser, Molecular Orbital Theory for
 * Organic Chemists (1961), from memory. */
static const mho_substituent table[] = {
    {"CH to N", "row of the parameter set", {"N-pyridine", NULL}, true, 0},
    {"amino", "row of the parameter set", {"N-pyrrole", NULL}, false, 0},
    {"methoxy", "row of the parameter set", {"O-furan", NULL}, false, 0},
    {"fluoro", "row of the parameter set", {"F", NULL}, false, 0},
    {"chloro", "row of the parameter set", {"Cl", NULL}, false, 0},
    {"methyl", "Streitwieser 1961, inductive, from memory", {NULL, NULL}, false, -0.5},
    {"cyano", "rows of the parameter set", {"C", "N-pyridine"}, false, 0},
    {"formyl", "rows of the parameter set", {"C", "O-carbonyl"}, false, 0},
};

enum { SUBSTITUENTS = sizeof table / sizeof *table };

const mho_substituent *mho_substituents(size_t *count)
{
  *count = SUBSTITUENTS;
  return table;
}

static bool is_known(const mho_molecule *m, const mho_substituent *s)
{
  for (int k = 0; k < 2; k++)
    if (s->row[k] && mho_parameters_find(m->parameters, s->row[k]) < 0) return false;
  return true;
}

/* A carbon of the parameter set with two bonds, no contact on it. */
static bool can_change(const mho_molecule *m, int site)
{
  int bonds = 0;
  if (m->site[site].explicit_onsite ||
      m->site[site].row != mho_parameters_find(m->parameters, "C"))
    return false;
  for (int b = 0; b < m->bond_count; b++) {
    const int *end = m->bond[b].site;
    if (end[0] != site && end[1] != site) continue;
    if (m->bond[b].explicit_hopping) return false;
    bonds++;
  }
  for (int side = 0; side < 2; side++)
    for (int k = 0; k < m->contact[side].count; k++)
      if (m->contact[side].site[k] == site) return false;
  return bonds == 2;
}

static void attach(mho_molecule *m, int to, const char *row)
{
  int index = mho_parameters_find(m->parameters, row);
  int electrons = mho_parameters_electrons(m->parameters, index);
  m->site[m->site_count] = (mho_site){.row = index, .electrons = electrons};
  m->bond[m->bond_count++] = (mho_bond){.site = {to, m->site_count}, .strength = 1.0};
  m->site_count++;
  m->electrons += electrons;
}

/* The molecule with a substituent at a site; mho_copy_numbers says who frees. */
static mho_status substitute(const mho_molecule *from, int site, const mho_substituent *s,
                             mho_molecule *to, mho_error *error)
{
  mho_status status = mho_copy_numbers(from, to, error);
  if (status != MHO_OK) return status;
  mho_site *sites = realloc(to->site, ((size_t)to->site_count + GROWTH) * sizeof *sites);
  if (sites) to->site = sites;
  mho_bond *bonds = realloc(to->bond, ((size_t)to->bond_count + GROWTH) * sizeof *bonds);
  if (bonds) to->bond = bonds;
  if (!sites || !bonds)
    return mho_fail(error, MHO_ERR_MEMORY, "analysis", NULL, "out of memory");
  mho_site *carbon = &to->site[site];
  if (s->inductive_h != 0) {
    carbon->onsite_ev = mho_molecule_onsite_ev(from, site) + s->inductive_h * from->beta_ev;
    carbon->explicit_onsite = true;
  }
  if (s->replaces) {
    carbon->row = mho_parameters_find(to->parameters, s->row[0]);
    to->electrons += mho_parameters_electrons(to->parameters, carbon->row) - carbon->electrons;
    return MHO_OK;
  }
  for (int k = 0, last = site; k < 2 && s->row[k]; k++) {
    attach(to, last, s->row[k]);
    last = to->site_count - 1;
  }
  return MHO_OK;
}

static mho_status evaluate(const mho_molecule *m, const double *fermi_ev, double *log10_g0,
                           mho_error *error)
{
  mho_molecule own = *m;
  mho_junction junction = {0};
  mho_plan *plan = NULL;
  own.fermi = (mho_fermi){.kind = MHO_FERMI_ENERGY, .offset_ev = fermi_ev[MIDDLE]};
  mho_status status = mho_junction_build(&own, &junction, error);
  if (status == MHO_OK) status = mho_plan_create(&junction, &plan, error);
  if (status == MHO_OK)
    status = mho_thermal_log10(plan, NULL, fermi_ev, LEVELS, MHO_BOLTZMANN_EV_PER_K * m->temperature_k,
                               log10_g0, error);
  mho_plan_free(plan);
  mho_junction_clear(&junction);
  return status;
}

static int compare_doubles(const void *a, const void *b)
{
  double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

static void take_change(const double *before, const double *after, mho_modification *row)
{
  double change[LEVELS];
  row->has_window = true;
  for (int i = 0; i < LEVELS; i++) {
    change[i] = after[i] - before[i];
    row->has_window &= isfinite(change[i]);
  }
  row->has_log = isfinite(after[MIDDLE]);
  row->log10_g0 = row->has_log ? after[MIDDLE] : 0;
  row->has_change = isfinite(change[MIDDLE]);
  row->change_decades = row->has_change ? change[MIDDLE] : 0;
  if (!row->has_window) return;
  qsort(change, LEVELS, sizeof *change, compare_doubles);
  row->window_low_decades = change[(int)(MHO_WINDOW_LOW_QUANTILE * (LEVELS - 1))];
  row->window_high_decades = change[(int)(MHO_WINDOW_HIGH_QUANTILE * (LEVELS - 1))];
}

/* Equal but for rounding counts as equal, so that the order does not depend on it. */
static int compare_rows(const void *a, const void *b)
{
  const mho_modification *p = a, *q = b;
  double x = p->has_change ? fabs(p->change_decades) : p->has_log ? p->log10_g0 : -INFINITY;
  double y = q->has_change ? fabs(q->change_decades) : q->has_log ? q->log10_g0 : -INFINITY;
  x = round(x * 1e9);
  y = round(y * 1e9);
  if (p->has_change != q->has_change) return p->has_change ? -1 : 1;
  if (x != y) return x > y ? -1 : 1;
  if (p->site != q->site) return p->site - q->site;
  return p->substituent < q->substituent ? -1 : p->substituent > q->substituent;
}

/* What a substituent does to H; can_change sees to it that two bonds are all. */
static void describe(const mho_molecule *from, const mho_molecule *to, int site,
                     mho_site_change *c)
{
  *c = (mho_site_change){.site = site};
  c->onsite_ev = mho_molecule_onsite_ev(to, site) - mho_molecule_onsite_ev(from, site);
  for (int b = 0; b < from->bond_count; b++) {
    const int *end = from->bond[b].site;
    if (end[0] != site && end[1] != site) continue;
    c->partner[c->bonds] = end[end[0] == site];
    c->hopping_ev[c->bonds++] = mho_molecule_hopping_ev(to, b) - mho_molecule_hopping_ev(from, b);
  }
  for (int k = from->site_count; k < to->site_count; k++, c->chain++) {
    c->chain_onsite_ev[c->chain] = mho_molecule_onsite_ev(to, k);
    c->chain_hopping_ev[c->chain] =
        mho_molecule_hopping_ev(to, from->bond_count + k - from->site_count);
  }
}

/* The rows, not yet filled, and what each does to H. */
static mho_status list_changes(const mho_molecule *molecule, mho_modifications *result,
                               mho_site_change *change, mho_error *error)
{
  for (int site = 0; site < molecule->site_count; site++)
    for (int k = 0; can_change(molecule, site) && k < SUBSTITUENTS; k++) {
      mho_molecule changed = {0};
      if (!is_known(molecule, &table[k])) continue;
      mho_status status = substitute(molecule, site, &table[k], &changed, error);
      if (status == MHO_OK) describe(molecule, &changed, site, &change[result->count]);
      free(changed.site);
      free(changed.bond);
      if (status != MHO_OK) return status;
      result->row[result->count++] = (mho_modification){.site = site, .substituent = &table[k]};
    }
  return MHO_OK;
}

/* As a molecule of its own, by its own plan. */
static mho_status evaluate_drawn(const mho_molecule *molecule, const mho_modification *row,
                                 const double *fermi, double *after, mho_error *error)
{
  mho_molecule changed = {0};
  mho_status status = substitute(molecule, row->site, row->substituent, &changed, error);
  if (status == MHO_OK) status = evaluate(&changed, fermi, after, error);
  free(changed.site);
  free(changed.bond);
  return status;
}

static mho_status fill(const mho_molecule *molecule, const mho_junction *junction,
                       const double *fermi, const double *before, mho_modifications *result,
                       mho_error *error)
{
  size_t most = (size_t)molecule->site_count * SUBSTITUENTS + 1;
  mho_site_change *change = malloc(most * sizeof *change);
  double *after = malloc(most * LEVELS * sizeof *after);
  bool *good = calloc(most, sizeof *good);
  result->row = calloc(most, sizeof *result->row);
  mho_status status = MHO_OK;
  if (!change || !after || !good || !result->row)
    status = mho_fail(error, MHO_ERR_MEMORY, "analysis", NULL, "out of memory");
  if (status == MHO_OK) status = list_changes(molecule, result, change, error);
  if (status == MHO_OK)
    status = mho_site_changes(junction, change, result->count, fermi, LEVELS,
                              MHO_BOLTZMANN_EV_PER_K * molecule->temperature_k, after, good,
                              error);
  for (size_t k = 0; status == MHO_OK && k < result->count; k++) {
    if (!good[k])
      status = evaluate_drawn(molecule, &result->row[k], fermi, after + k * LEVELS, error);
    if (status == MHO_OK) take_change(before, after + k * LEVELS, &result->row[k]);
  }
  free(change);
  free(after);
  free(good);
  return status;
}

mho_status mho_modify_rank(const mho_molecule *molecule, const mho_junction *junction,
                           double window_ev, mho_modifications *result, mho_error *error)
{
  double fermi[LEVELS], before[LEVELS];
  *result = (mho_modifications){0};
  if (!(window_ev >= 0 && isfinite(window_ev)))
    return mho_fail(error, MHO_ERR_RANGE, "analysis", "window",
                    "the window must be finite and not negative");
  for (int i = 0; i < LEVELS; i++)
    fermi[i] = junction->fermi_ev + window_ev * (i - MIDDLE) / MIDDLE;
  mho_status status = mho_junction_require_contacts(junction, molecule, error);
  if (status == MHO_OK) status = evaluate(molecule, fermi, before, error);
  if (status == MHO_OK) status = fill(molecule, junction, fermi, before, result, error);
  if (status == MHO_OK) qsort(result->row, result->count, sizeof *result->row, compare_rows);
  return status;
}

void mho_modifications_clear(mho_modifications *result)
{
  free(result->row);
  *result = (mho_modifications){0};
}
