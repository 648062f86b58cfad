/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <mho/junction.h>

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/lapack.h"

/* Two levels count as one where they differ by less than rounding leaves. */
#define DEGENERACY_RELATIVE 1e-10

static mho_status fail_memory(mho_error *error)
{
  return mho_fail(error, MHO_ERR_MEMORY, "model", NULL, "out of memory");
}

static void build_hamiltonian(const mho_molecule *molecule, double *h)
{
  size_t n = (size_t)molecule->site_count;
  for (int i = 0; i < molecule->site_count; i++)
    h[(size_t)i * n + (size_t)i] = mho_molecule_onsite_ev(molecule, i);
  for (int b = 0; b < molecule->bond_count; b++) {
    size_t i = (size_t)molecule->bond[b].site[0];
    size_t j = (size_t)molecule->bond[b].site[1];
    double hopping = mho_molecule_hopping_ev(molecule, b);
    h[i * n + j] += hopping;
    h[j * n + i] = h[i * n + j];
  }
}

static mho_status copy_chain(const mho_chain_electrode *from, mho_lead *to, mho_error *error)
{
  mho_chain_electrode *chain = malloc(sizeof *chain);
  if (!chain) return fail_memory(error);
  *chain = *from;
  to->chain = chain;
  return MHO_OK;
}

static mho_status build_lead(const mho_contact *contact, int sites,
                             mho_lead *lead, mho_error *error)
{
  bool one = contact->channels == MHO_CHANNELS_ONE;
  lead->channels = one && contact->count > 0 ? 1 : contact->count;
  if (lead->channels == 0) return MHO_OK;
  size_t channels = (size_t)lead->channels;
  lead->coupling_ev = malloc(channels * sizeof(double));
  lead->shift_ev = malloc(channels * sizeof(double));
  lead->vector = calloc(channels * (size_t)sites, sizeof(double));
  if (!lead->coupling_ev || !lead->shift_ev || !lead->vector)
    return fail_memory(error);
  for (size_t c = 0; c < channels; c++) {
    lead->coupling_ev[c] = contact->coupling_ev;
    lead->shift_ev[c] = contact->shift_ev;
  }
  for (int k = 0; k < contact->count; k++) {
    size_t channel = one ? 0 : (size_t)k;
    lead->vector[channel * (size_t)sites + (size_t)contact->site[k]] =
        one ? contact->amplitude[k] : 1.0;
  }
  return contact->has_chain ? copy_chain(&contact->chain, lead, error) : MHO_OK;
}

/* Aufbau: two electrons a level from below. */
static void fill_levels(mho_junction *junction)
{
  int n = junction->sites, occupied = junction->electrons / 2;
  double scale = fmax(fabs(junction->level_ev[0]), fabs(junction->level_ev[n - 1]));
  bool odd = junction->electrons % 2 != 0;
  junction->has_homo = junction->electrons > 0;
  junction->has_lumo = junction->electrons < 2 * n;
  int homo = odd ? occupied : occupied - 1;
  int lumo = occupied;
  if (junction->has_homo) junction->homo_ev = junction->level_ev[homo];
  if (junction->has_lumo) junction->lumo_ev = junction->level_ev[lumo];
  bool degenerate = junction->has_homo && junction->has_lumo && !odd &&
                    junction->lumo_ev - junction->homo_ev <=
                        DEGENERACY_RELATIVE * scale;
  junction->open_shell = odd || degenerate;
}

static mho_status refuse_fermi(const mho_molecule *molecule, const char *why,
                               mho_error *error)
{
  const mho_fermi *fermi = &molecule->fermi;
  const char *name = molecule->name ? molecule->name : "";
  if (fermi->line && molecule->source)
    return mho_fail_at(error, MHO_ERR_FRONTIER, "model", molecule->source,
                       fermi->line, fermi->column, "fermi",
                       "fermi: the molecule %s; give an energy such as '0 eV'",
                       why);
  return mho_fail(error, MHO_ERR_FRONTIER, "model", "fermi",
                  "fermi: molecule '%s' %s; give an energy such as '0 eV'",
                  name, why);
}

static mho_status resolve_fermi(const mho_molecule *molecule,
                                mho_junction *junction, mho_error *error)
{
  const mho_fermi *fermi = &molecule->fermi;
  bool needs_homo = fermi->kind == MHO_FERMI_HOMO || fermi->kind == MHO_FERMI_MIDGAP;
  bool needs_lumo = fermi->kind == MHO_FERMI_LUMO || fermi->kind == MHO_FERMI_MIDGAP;
  if (needs_homo || needs_lumo) {
    if (junction->open_shell)
      return refuse_fermi(molecule,
                          junction->electrons % 2
                              ? "has an odd number of electrons"
                              : "has a degenerate, partly filled frontier",
                          error);
    if (needs_homo && !junction->has_homo)
      return refuse_fermi(molecule, "has no occupied level", error);
    if (needs_lumo && !junction->has_lumo)
      return refuse_fermi(molecule, "has no empty level", error);
  }
  switch (fermi->kind) {
  case MHO_FERMI_ENERGY: junction->fermi_ev = fermi->offset_ev; break;
  case MHO_FERMI_MIDGAP:
    junction->fermi_ev = 0.5 * (junction->homo_ev + junction->lumo_ev) + fermi->offset_ev;
    break;
  case MHO_FERMI_HOMO: junction->fermi_ev = junction->homo_ev + fermi->offset_ev; break;
  case MHO_FERMI_LUMO: junction->fermi_ev = junction->lumo_ev + fermi->offset_ev; break;
  }
  return MHO_OK;
}

/* Room for a junction of n sites, Hamiltonian zero. */
static mho_status allocate(mho_junction *junction, int sites, mho_error *error)
{
  memset(junction, 0, sizeof *junction);
  if (sites < 1)
    return mho_fail(error, MHO_ERR_SIZE, "model", "sites",
                    "a molecule needs at least one site");
  size_t n = (size_t)sites;
  junction->sites = sites;
  junction->temperature_k = MHO_DEFAULT_TEMPERATURE_K;
  junction->hamiltonian_ev = calloc(n * n, sizeof(double));
  junction->orbital = malloc(n * n * sizeof(double));
  junction->level_ev = malloc(n * sizeof(double));
  if (!junction->hamiltonian_ev || !junction->orbital || !junction->level_ev)
    return fail_memory(error);
  return MHO_OK;
}

static mho_status solve_levels(mho_junction *junction, mho_error *error)
{
  size_t n = (size_t)junction->sites;
  memcpy(junction->orbital, junction->hamiltonian_ev, n * n * sizeof(double));
  mho_status status = mho_eigen_symmetric(junction->sites, junction->orbital,
                                          junction->level_ev, error);
  if (status == MHO_OK) fill_levels(junction);
  return status;
}

mho_status mho_junction_build(const mho_molecule *molecule,
                              mho_junction *junction, mho_error *error)
{
  mho_status status = allocate(junction, molecule->site_count, error);
  if (status != MHO_OK) return status;
  junction->electrons = molecule->electrons;
  junction->temperature_k = molecule->temperature_k;
  build_hamiltonian(molecule, junction->hamiltonian_ev);
  status = solve_levels(junction, error);
  for (int side = 0; status == MHO_OK && side < 2; side++)
    status = build_lead(&molecule->contact[side], junction->sites,
                        &junction->lead[side], error);
  return status == MHO_OK ? resolve_fermi(molecule, junction, error) : status;
}

static mho_status copy_lead(const mho_lead *from, int sites, mho_lead *to,
                            mho_error *error)
{
  if (!from || from->channels == 0) return MHO_OK;
  size_t m = (size_t)from->channels, n = (size_t)sites;
  to->coupling_ev = malloc(m * sizeof(double));
  to->shift_ev = malloc(m * sizeof(double));
  to->vector = malloc(m * n * sizeof(double));
  if (!to->coupling_ev || !to->shift_ev || !to->vector) return fail_memory(error);
  to->channels = from->channels;
  memcpy(to->coupling_ev, from->coupling_ev, m * sizeof(double));
  memcpy(to->shift_ev, from->shift_ev, m * sizeof(double));
  memcpy(to->vector, from->vector, m * n * sizeof(double));
  return from->chain ? copy_chain(from->chain, to, error) : MHO_OK;
}

mho_status mho_junction_from_hamiltonian(int sites, const double *hamiltonian_ev,
                                         int electrons, double fermi_ev,
                                         const mho_lead *left, const mho_lead *right,
                                         mho_junction *junction, mho_error *error)
{
  mho_status status = allocate(junction, sites, error);
  if (status != MHO_OK) return status;
  if (electrons < 0 || electrons > 2 * sites)
    return mho_fail(error, MHO_ERR_SIZE, "model", "electrons",
                    "%d electrons do not fit %d sites; allowed are 0 to %d",
                    electrons, sites, 2 * sites);
  size_t n = (size_t)sites;
  for (size_t i = 0; i < n; i++)
    for (size_t j = 0; j < n; j++) {
      double value = hamiltonian_ev[i * n + j];
      if (!isfinite(value) || value != hamiltonian_ev[j * n + i])
        return mho_fail(error, MHO_ERR_NOT_FINITE, "model", "hamiltonian",
                        "entry %zu,%zu is not finite or not symmetric", i, j);
      junction->hamiltonian_ev[i * n + j] = value;
    }
  junction->electrons = electrons;
  junction->fermi_ev = fermi_ev;
  status = solve_levels(junction, error);
  if (status == MHO_OK)
    status = copy_lead(left, sites, &junction->lead[MHO_LEFT], error);
  if (status == MHO_OK)
    status = copy_lead(right, sites, &junction->lead[MHO_RIGHT], error);
  return status;
}

void mho_junction_clear(mho_junction *junction)
{
  free(junction->hamiltonian_ev);
  free(junction->level_ev);
  free(junction->orbital);
  for (int side = 0; side < 2; side++) {
    free(junction->lead[side].coupling_ev);
    free(junction->lead[side].shift_ev);
    free(junction->lead[side].vector);
    free((void *)junction->lead[side].chain);
  }
  memset(junction, 0, sizeof *junction);
}

mho_status mho_junction_require_contacts(const mho_junction *junction,
                                         const mho_molecule *molecule,
                                         mho_error *error)
{
  static const char *const side_name[] = {"left", "right"};
  for (int side = 0; side < 2; side++)
    if (junction->lead[side].channels == 0)
      return mho_fail_at(error, MHO_ERR_CONTACTS, "model",
                         molecule->source ? molecule->source : "", 0, 0,
                         "electrodes",
                         "molecule '%s' has no %s contact; give "
                         "electrodes: {left: ..., right: ...}",
                         molecule->name ? molecule->name : "", side_name[side]);
  return MHO_OK;
}

mho_status mho_molecule_require_wide_band(const mho_molecule *molecule, const char *what,
                                          mho_error *error)
{
  for (int side = 0; side < 2; side++) {
    const mho_contact *contact = &molecule->contact[side];
    if (contact->has_chain)
      return mho_fail_at(error, MHO_ERR_RANGE, "model", molecule->source ? molecule->source : "",
                         contact->line, contact->column, "chain",
                         "chain: %s needs electrodes of a wide band; --coupling '0.5 eV' puts "
                         "them in the place of chains",
                         what);
  }
  return MHO_OK;
}

/* Marks every site that a lead's vectors touch. */
static void mark_lead(const mho_lead *lead, int sites, bool *mark)
{
  for (int c = 0; c < lead->channels; c++)
    for (int i = 0; i < sites; i++)
      if (lead->vector[(size_t)c * (size_t)sites + (size_t)i] != 0.0)
        mark[i] = true;
}

mho_status mho_junction_is_connected(const mho_junction *junction, bool *connected,
                                     mho_error *error)
{
  size_t n = (size_t)junction->sites, head = 0, tail = 0;
  bool *reached = calloc(2 * n, sizeof(bool)), *target = reached + n;
  int *queue = malloc(n * sizeof(int));
  *connected = false;
  if (!reached || !queue) {
    free(reached);
    free(queue);
    return fail_memory(error);
  }
  mark_lead(&junction->lead[MHO_LEFT], junction->sites, reached);
  mark_lead(&junction->lead[MHO_RIGHT], junction->sites, target);
  for (size_t i = 0; i < n; i++)
    if (reached[i]) queue[tail++] = (int)i;
  while (head < tail && !*connected) {
    size_t i = (size_t)queue[head++];
    *connected = target[i];
    for (size_t j = 0; j < n; j++)
      if (!reached[j] && junction->hamiltonian_ev[i * n + j] != 0.0) {
        reached[j] = true;
        queue[tail++] = (int)j;
      }
  }
  free(reached);
  free(queue);
  return MHO_OK;
}
