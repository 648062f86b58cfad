/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <mho/molecule.h>

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "molecule/texts.h"

#define RADIANS_PER_DEGREE 0.017453292519943295769236907684886

void mho_molecule_init(mho_molecule *molecule)
{
  memset(molecule, 0, sizeof *molecule);
  molecule->parameters = mho_parameters_builtin("van-catledge");
  molecule->beta_ev = MHO_DEFAULT_BETA_EV;
  molecule->temperature_k = MHO_DEFAULT_TEMPERATURE_K;
  for (int side = 0; side < 2; side++)
    molecule->contact[side].coupling_ev = MHO_DEFAULT_COUPLING_EV;
}

void mho_molecule_clear(mho_molecule *molecule)
{
  free(molecule->name);
  free(molecule->source);
  free(molecule->smiles);
  free(molecule->site);
  free(molecule->bond);
  free(molecule->linker);
  for (int i = 0; i < molecule->torsion_count; i++) free(molecule->torsion[i].name);
  free(molecule->torsion);
  mho_graph_clear(&molecule->graph);
  free(molecule->site_atom);
  mho_texts_clear(&molecule->notes);
  mho_parameters_free(molecule->own_parameters);
  for (int side = 0; side < 2; side++) {
    free(molecule->contact[side].site);
    free(molecule->contact[side].amplitude);
  }
  mho_molecule_init(molecule);
}

int mho_molecule_find_site(const mho_molecule *molecule, const char *id)
{
  for (int i = 0; i < molecule->site_count; i++)
    if (!strcmp(molecule->site[i].id, id)) return i;
  return -1;
}

double mho_molecule_onsite_ev(const mho_molecule *molecule, int site)
{
  const mho_site *s = &molecule->site[site];
  if (s->explicit_onsite) return s->onsite_ev;
  return mho_parameters_h(molecule->parameters, s->row) * molecule->beta_ev;
}

double mho_molecule_hopping_ev(const mho_molecule *molecule, int bond)
{
  const mho_bond *b = &molecule->bond[bond];
  double hopping = b->hopping_ev;
  if (!b->explicit_hopping) {
    const mho_site *first = &molecule->site[b->site[0]];
    const mho_site *second = &molecule->site[b->site[1]];
    hopping = b->strength * molecule->beta_ev *
              mho_parameters_k(molecule->parameters, first->row, second->row);
  }
  return hopping * mho_cos_deg(b->twist_deg);
}

double mho_cos_deg(double angle_deg)
{
  double angle = fabs(fmod(angle_deg, 360.0));
  if (angle > 180.0) angle = 360.0 - angle;
  double sign = 1.0;
  if (angle > 90.0) {
    angle = 180.0 - angle;
    sign = -1.0;
  }
  if (angle == 90.0) return 0.0;
  if (angle == 60.0) return 0.5 * sign;
  return sign * cos(angle * RADIANS_PER_DEGREE);
}

int mho_molecule_find_bond(const mho_molecule *m, const char *text)
{
  for (int b = 0; b < m->bond_count; b++)
    for (int end = 0; end < 2; end++) {
      const char *first = m->site[m->bond[b].site[end]].id;
      size_t length = strlen(first);
      if (!strncmp(text, first, length) && text[length] == '-' &&
          !strcmp(text + length + 1, m->site[m->bond[b].site[!end]].id))
        return b;
    }
  return -1;
}

mho_status mho_molecule_torsion(const mho_molecule *molecule, int bond, mho_torsion *torsion,
                                const char **name, mho_error *error)
{
  const mho_bond_torsion *found = NULL;
  for (int i = 0; i < molecule->torsion_count; i++) {
    const mho_bond_torsion *t = &molecule->torsion[i];
    if (t->bond == bond || (t->bond < 0 && !found)) found = t;
  }
  const mho_bond *b = &molecule->bond[bond];
  *name = found ? found->name : b->torsion;
  if (found) *torsion = found->potential;
  if (found) return MHO_OK;
  if (b->torsion) return mho_torsion_read(b->torsion, NULL, torsion, error);
  return mho_fail_at(error, MHO_ERR_REFERENCE, "model",
                     molecule->source ? molecule->source : molecule->name, 0, 0, "torsion",
                     "torsion: no potential is known for the bond %s-%s of '%.60s'; give one as "
                     "torsion, here or in the molecule file",
                     molecule->site[b->site[0]].id, molecule->site[b->site[1]].id,
                     molecule->name ? molecule->name : "");
}
