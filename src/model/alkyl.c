/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Alkyl groups on a pi system, after A. Streitwieser, Molecular Orbital
 * Theory for Organic Chemists (1961), values from memory: inductive model, h
 * of the carbon that bears the group is -0.5 (for each group); heteroatom
 * model, the group is a site with h 2.0, k 0.7 and two electrons.
 */
#include "model/alkyl.h"

#include "molecule/element.h"
#include "molecule/texts.h"

#define INDUCTIVE_H (-0.5)
#define GROUP_H 2.0
#define GROUP_K 0.7
enum { GROUP_ELECTRONS = 2 };

/* Saturated carbon with hydrogens or with carbons only. */
static bool is_alkyl(const mho_graph *g, const mho_pi *pi, const bool *removed,
                     int atom)
{
  if (g->atom[atom].element != ELEMENT_C || pi->site_of[atom] >= 0 || removed[atom]) return false;
  if (mho_graph_hydrogens(g, atom) > 0) return true;
  for (int i = g->start[atom]; i < g->start[atom + 1]; i++)
    if (g->atom[g->link[i].atom].element != ELEMENT_C) return false;
  return true;
}

static void add_group(mho_molecule *m, mho_structure *structure, int atom)
{
  mho_site *site = &m->site[m->site_count];
  mho_graph_atom_name(&structure->graph, atom, site->id, sizeof site->id);
  site->row = -1;
  site->explicit_onsite = true;
  site->onsite_ev = GROUP_H * m->beta_ev;
  site->electrons = GROUP_ELECTRONS;
  structure->site_atom[m->site_count++] = atom;
}

static void add_hopping(mho_molecule *m, int site)
{
  m->bond[m->bond_count++] = (mho_bond){.site = {site, m->site_count - 1},
                                        .strength = 1.0,
                                        .explicit_hopping = true,
                                        .hopping_ev = GROUP_K * m->beta_ev};
}

mho_status mho_alkyl_apply(const mho_pi *pi, const bool *removed,
                           const mho_structure_options *options,
                           mho_molecule *molecule, mho_structure *structure,
                           mho_error *error)
{
  static const char *const choice[] = {
      [MHO_ALKYL_IGNORED] = "left out",
      [MHO_ALKYL_INDUCTIVE] = "shift the carbon that bears them by h = -0.5",
      [MHO_ALKYL_HETEROATOM] = "are sites with h = 2.0, k = 0.7, two electrons"};
  const mho_graph *g = &structure->graph;
  int groups = 0;
  for (int a = 0; a < g->atom_count; a++) {
    if (!is_alkyl(g, pi, removed, a)) continue;
    bool found = false;
    for (int i = g->start[a]; i < g->start[a + 1]; i++) {
      int next = g->link[i].atom, site = pi->site_of[next];
      if (site < 0 || g->atom[next].element != ELEMENT_C) continue;
      if (!found && options->alkyl == MHO_ALKYL_HETEROATOM) add_group(molecule, structure, a);
      found = true;
      if (options->alkyl == MHO_ALKYL_HETEROATOM) add_hopping(molecule, site);
      if (options->alkyl != MHO_ALKYL_INDUCTIVE) continue;
      molecule->site[site].explicit_onsite = true;
      molecule->site[site].onsite_ev += INDUCTIVE_H * molecule->beta_ev;
    }
    groups += found;
  }
  if (molecule->site_count > MHO_SITE_LIMIT)
    return mho_fail(error, MHO_ERR_LIMIT, "model", "alkyl",
                    "%d sites with the alkyl groups; at most %d are allowed",
                    molecule->site_count, MHO_SITE_LIMIT);
  if (groups && !options->quiet &&
      mho_texts_add(&structure->notes, "alkyl groups on the pi system (%d) %s",
                              groups, choice[options->alkyl]) != MHO_OK)
    return mho_fail(error, MHO_ERR_MEMORY, "model", NULL, "out of memory");
  return MHO_OK;
}
