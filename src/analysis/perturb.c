/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "analysis/perturb.h"

#include <mho/constants.h>
#include <mho/transmission.h>

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "analysis/thermal.h"

/* The linker found at a site, or NULL. */
static const char *kind_at(const mho_molecule *molecule, int site)
{
  for (int i = 0; i < molecule->linker_count; i++)
    if (molecule->linker[i].site == site) return molecule->linker[i].kind;
  return NULL;
}

/* One coupling, one row of the parameters and, where linkers were found, one kind. */
static bool one_kind(const mho_molecule *molecule)
{
  const mho_contact *left = &molecule->contact[MHO_LEFT], *right = &molecule->contact[MHO_RIGHT];
  if (left->count == 0 || right->count == 0 || left->coupling_ev != right->coupling_ev ||
      molecule->site[left->site[0]].row != molecule->site[right->site[0]].row)
    return false;
  const char *a = kind_at(molecule, left->site[0]), *b = kind_at(molecule, right->site[0]);
  return !a || !b || !strcmp(a, b);
}

static bool can_turn(const mho_bond *bond)
{
  return bond->rotatable || bond->twist_deg != 0.0;
}

mho_status mho_parameter_list(const mho_molecule *molecule, const mho_uncertainties *sigma,
                              mho_sensitivity_row **row, size_t *count, mho_error *error)
{
  size_t most = 4 + (size_t)molecule->site_count + 2 * (size_t)molecule->bond_count, n = 0;
  mho_sensitivity_row *list = calloc(most, sizeof *list);
  if (!list) return mho_fail(error, MHO_ERR_MEMORY, "analysis", NULL, "out of memory");
  double beta = fabs(molecule->beta_ev);
  list[n++] = (mho_sensitivity_row){.kind = MHO_PARAMETER_FERMI, .sigma = sigma->fermi_ev};
  list[n++] = (mho_sensitivity_row){.kind = MHO_PARAMETER_BETA, .sigma = sigma->beta_ev};
  bool same = one_kind(molecule);
  for (int side = same ? 2 : 0; side < (same ? 3 : 2); side++)
    list[n++] = (mho_sensitivity_row){MHO_PARAMETER_COUPLING, side, 0, sigma->ln_coupling, 0};
  for (int i = 0; i < molecule->site_count; i++)
    list[n++] = molecule->site[i].explicit_onsite
                    ? (mho_sensitivity_row){MHO_PARAMETER_ONSITE, i, 0, sigma->h * beta, 0}
                    : (mho_sensitivity_row){MHO_PARAMETER_H, i, 0, sigma->h, 0};
  for (int b = 0; b < molecule->bond_count; b++)
    list[n++] = molecule->bond[b].explicit_hopping
                    ? (mho_sensitivity_row){MHO_PARAMETER_HOPPING, b, 0, sigma->k * beta, 0}
                    : (mho_sensitivity_row){MHO_PARAMETER_K, b, 0, sigma->k, 0};
  for (int b = 0; b < molecule->bond_count; b++)
    if (can_turn(&molecule->bond[b]))
      list[n++] = (mho_sensitivity_row){MHO_PARAMETER_TWIST, b, 0, sigma->twist_deg, 0};
  *row = list;
  *count = n;
  return MHO_OK;
}

mho_status mho_copy_numbers(const mho_molecule *from, mho_molecule *to, mho_error *error)
{
  size_t sites = (size_t)from->site_count, bonds = (size_t)from->bond_count;
  *to = *from;
  to->site = malloc((sites + 1) * sizeof *to->site);
  to->bond = malloc((bonds + 1) * sizeof *to->bond);
  if (!to->site || !to->bond)
    return mho_fail(error, MHO_ERR_MEMORY, "analysis", NULL, "out of memory");
  if (sites) memcpy(to->site, from->site, sites * sizeof *to->site);
  if (bonds) memcpy(to->bond, from->bond, bonds * sizeof *to->bond);
  return MHO_OK;
}

/* Untwisted hopping of a bond with k moved. */
static double moved_hopping(const mho_molecule *m, int b, double shift)
{
  const mho_bond *bond = &m->bond[b];
  const mho_site *first = &m->site[bond->site[0]], *second = &m->site[bond->site[1]];
  double k = mho_parameters_k(m->parameters, first->row, second->row);
  return bond->strength * (k + shift) * m->beta_ev;
}

static void move(const mho_sensitivity_row *row, double shift, const mho_molecule *original,
                 mho_molecule *m)
{
  switch (row->kind) {
  case MHO_PARAMETER_FERMI: m->fermi.offset_ev += shift; break;
  case MHO_PARAMETER_BETA: break; /* moved before all others */
  case MHO_PARAMETER_COUPLING:
    for (int side = 0; side < 2; side++)
      if (row->index == 2 || row->index == side) m->contact[side].coupling_ev *= exp(shift);
    break;
  case MHO_PARAMETER_H:
    m->site[row->index].onsite_ev =
        (mho_parameters_h(m->parameters, m->site[row->index].row) + shift) * m->beta_ev;
    m->site[row->index].explicit_onsite = true;
    break;
  case MHO_PARAMETER_ONSITE: m->site[row->index].onsite_ev += shift; break;
  case MHO_PARAMETER_K:
    m->bond[row->index].hopping_ev = moved_hopping(original, row->index, shift) *
                                     (m->beta_ev / original->beta_ev);
    m->bond[row->index].explicit_hopping = true;
    break;
  case MHO_PARAMETER_HOPPING: m->bond[row->index].hopping_ev += shift; break;
  case MHO_PARAMETER_TWIST: m->bond[row->index].twist_deg += shift; break;
  }
}

mho_status mho_perturbed_log10(const mho_molecule *molecule, double fermi_ev,
                               const mho_sensitivity_row *row, size_t count,
                               const double *shift, double *log10_g0, mho_error *error)
{
  mho_molecule moved;
  mho_junction junction = {0};
  mho_plan *plan = NULL;
  mho_status status = mho_copy_numbers(molecule, &moved, error);
  moved.fermi = (mho_fermi){.kind = MHO_FERMI_ENERGY, .offset_ev = fermi_ev};
  for (size_t p = 0; p < count; p++)
    if (row[p].kind == MHO_PARAMETER_BETA) moved.beta_ev += shift[p];
  for (size_t p = 0; status == MHO_OK && p < count; p++) move(&row[p], shift[p], molecule, &moved);
  if (status == MHO_OK) status = mho_junction_build(&moved, &junction, error);
  if (status == MHO_OK) status = mho_plan_create(&junction, &plan, error);
  if (status == MHO_OK)
    status = mho_thermal_log10(plan, NULL, &junction.fermi_ev, 1,
                               MHO_BOLTZMANN_EV_PER_K * molecule->temperature_k, log10_g0, error);
  mho_plan_free(plan);
  mho_junction_clear(&junction);
  free(moved.site);
  free(moved.bond);
  return status;
}
