/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * `mho check`: what was understood of a molecule, as JSON and for the eye.
 */
#include <mho/quantity.h>
#include <mho/warning.h>

#include <math.h>
#include <string.h>

#include "report/drawing.h"
#include "report/json.h"
#include "report/stages.h"

static const char *const side_name[] = {"left", "right"};
static const char *const length_origin[] = {
    [MHO_LENGTH_COORDINATES] = "coordinates", [MHO_LENGTH_IDEALISED] = "idealised"};

static json_t *json_optional(bool present, double value)
{
  return present ? json_real(value) : json_null();
}

static json_t *json_id_list(const mho_molecule *molecule, const int *site, int count)
{
  json_t *list = json_array();
  for (int i = 0; i < count; i++)
    list = mho_json_append(list, mho_json_text(molecule->site[site[i]].id));
  return list;
}

/* place: of the site in the drawing. */
static json_t *json_site(const mho_molecule *molecule, int index, const double *place)
{
  const mho_site *site = &molecule->site[index];
  const char *row = mho_parameters_row_name(molecule->parameters, site->row);
  json_t *object = json_object();
  object = mho_json_with(object, "id", mho_json_text(site->id));
  object = mho_json_with(object, "element", row ? mho_json_text(row) : json_null());
  object = mho_json_with(object, "onsite_eV", json_real(mho_molecule_onsite_ev(molecule, index)));
  object = mho_json_with(object, "electrons", row ? json_integer(site->electrons) : json_null());
  object = mho_json_with(object, "x", json_real(place[0]));
  object = mho_json_with(object, "y", json_real(place[1]));
  return object;
}

static json_t *json_bond(const mho_molecule *molecule, int index)
{
  const mho_bond *bond = &molecule->bond[index];
  json_t *object = json_object();
  object = mho_json_with(object, "between", json_id_list(molecule, bond->site, 2));
  object = mho_json_with(object, "hopping_eV",
                      json_real(mho_molecule_hopping_ev(molecule, index)));
  object = mho_json_with(object, "twist_deg", json_real(bond->twist_deg));
  object = mho_json_with(object, "rotatable", json_boolean(bond->rotatable));
  return object;
}

json_t *mho_json_chain(const mho_chain_electrode *chain)
{
  json_t *object = mho_json_with(json_object(), "centre_eV", json_real(chain->center_ev));
  object = mho_json_with(object, "hopping_eV", json_real(chain->hopping_ev));
  return mho_json_with(object, "joint_eV", json_real(chain->joint_ev));
}

static json_t *json_contacts(const mho_molecule *molecule)
{
  json_t *contacts = json_object();
  for (int side = 0; side < 2; side++) {
    const mho_contact *contact = &molecule->contact[side];
    if (contact->count == 0) continue;
    bool one = contact->channels == MHO_CHANNELS_ONE;
    json_t *object = json_object(), *amplitude = json_array();
    for (int i = 0; i < contact->count; i++)
      amplitude = mho_json_append(amplitude, json_real(one ? contact->amplitude[i] : 1.0));
    object = mho_json_with(object, "sites", json_id_list(molecule, contact->site, contact->count));
    bool wide = !contact->has_chain;
    object = mho_json_with(object, "coupling_eV", json_optional(wide, contact->coupling_ev));
    object = mho_json_with(object, "shift_eV", json_optional(wide, contact->shift_ev));
    if (!wide) object = mho_json_with(object, "chain", mho_json_chain(&contact->chain));
    object = mho_json_with(object, "channels", mho_json_text(one ? "one" : "independent"));
    object = mho_json_with(object, "amplitude", amplitude);
    contacts = mho_json_with(contacts, side_name[side], object);
  }
  return contacts;
}

static json_t *json_linkers(const mho_molecule *molecule)
{
  json_t *list = json_array();
  for (int i = 0; i < molecule->linker_count; i++) {
    json_t *object = mho_json_with(json_object(), "kind", mho_json_text(molecule->linker[i].kind));
    const char *site = molecule->site[molecule->linker[i].site].id;
    list = mho_json_append(list, mho_json_with(object, "site", mho_json_text(site)));
  }
  return list;
}

static json_t *json_notes(const mho_molecule *molecule)
{
  json_t *list = json_array();
  for (int i = 0; i < molecule->notes.count; i++)
    list = mho_json_append(list, mho_json_text(molecule->notes.text[i]));
  return list;
}

static json_t *json_molecule(const mho_checked *checked)
{
  const mho_molecule *molecule = checked->molecule;
  const mho_junction *junction = checked->junction;
  double length = 0;
  mho_length_kind kind = MHO_LENGTH_NONE;
  mho_drawing drawing;
  mho_status status = mho_drawing_make(molecule, &drawing, NULL);
  if (status == MHO_OK) status = mho_molecule_length(molecule, &length, &kind);
  json_t *sites = json_array(), *bonds = json_array(), *levels = json_array();
  for (int i = 0; status == MHO_OK && i < molecule->site_count; i++)
    sites = mho_json_append(sites,
                            json_site(molecule, i, drawing.position[drawing.site_point[i]]));
  mho_drawing_clear(&drawing);
  for (int b = 0; b < molecule->bond_count; b++)
    bonds = mho_json_append(bonds, json_bond(molecule, b));
  for (int k = 0; k < junction->sites; k++)
    levels = mho_json_append(levels, json_real(junction->level_ev[k]));
  json_t *object = status == MHO_OK ? json_object() : NULL;
  object = mho_json_with(object, "name", mho_json_text(molecule->name));
  object = mho_json_with(object, "parameters",
                      mho_json_text(mho_parameters_name(molecule->parameters)));
  object = mho_json_with(object, "beta_eV", json_real(molecule->beta_ev));
  object = mho_json_with(object, "temperature_K", json_real(molecule->temperature_k));
  object = mho_json_with(object, "sites", sites);
  object = mho_json_with(object, "bonds", bonds);
  object = mho_json_with(object, "electrons", json_integer(molecule->electrons));
  object = mho_json_with(object, "charge", json_integer(molecule->charge));
  object = mho_json_with(object, "levels_eV", levels);
  object = mho_json_with(object, "homo_eV", json_optional(junction->has_homo, junction->homo_ev));
  object = mho_json_with(object, "lumo_eV", json_optional(junction->has_lumo, junction->lumo_ev));
  object = mho_json_with(object, "fermi_eV", json_real(junction->fermi_ev));
  object = mho_json_with(object, "linkers", json_linkers(molecule));
  object = mho_json_with(object, "contacts", json_contacts(molecule));
  object = mho_json_with(object, "length_nm", json_optional(kind != MHO_LENGTH_NONE, length));
  object = mho_json_with(object, "length_from", kind == MHO_LENGTH_NONE ? json_null()
                                                : mho_json_text(length_origin[kind]));
  object = mho_json_with(object, "warnings", mho_json_warning_words(checked->warnings));
  object = mho_json_with(object, "notes", json_notes(molecule));
  return object;
}

json_t *mho_json_molecules(const mho_checked *checked, size_t count)
{
  json_t *list = json_array();
  for (size_t i = 0; i < count; i++) list = mho_json_append(list, json_molecule(&checked[i]));
  return list;
}

mho_status mho_write_check_json(const mho_checked *checked, size_t count, mho_buffer *buffer,
                                mho_error *error)
{
  json_t *object = json_object();
  object = mho_json_with(object, "schema", mho_json_text(MHO_JSON_SCHEMA));
  object = mho_json_with(object, "molecules", mho_json_molecules(checked, count));
  return mho_json_write(object, buffer, error);
}

static void write_level(mho_buffer *buffer, const char *name, bool present, double value,
                        int digits)
{
  mho_buffer_print(buffer, "%s ", name);
  if (present) {
    mho_buffer_number(buffer, digits, value);
    mho_buffer_add(buffer, " eV");
  } else {
    mho_buffer_add(buffer, "none");
  }
}

static void write_energy(mho_buffer *buffer, const char *before, int digits, double energy_ev)
{
  mho_buffer_add(buffer, before);
  mho_buffer_number(buffer, digits, energy_ev);
}

void mho_write_electrode(const mho_contact *contact, int digits, mho_buffer *buffer)
{
  const mho_chain_electrode *chain = &contact->chain;
  double half = 2 * fabs(chain->hopping_ev);
  if (!contact->has_chain) {
    write_energy(buffer, "coupling ", digits, contact->coupling_ev);
  } else {
    write_energy(buffer, "chain of hopping ", digits, chain->hopping_ev);
    write_energy(buffer, " eV, joint ", digits, chain->joint_ev);
    write_energy(buffer, " eV, band ", digits, chain->center_ev - half);
    write_energy(buffer, " to ", digits, chain->center_ev + half);
  }
  mho_buffer_add(buffer, " eV");
}

static void write_contact(const mho_molecule *molecule, int side, int digits,
                          mho_buffer *buffer)
{
  const mho_contact *contact = &molecule->contact[side];
  mho_buffer_print(buffer, "  %-9s ", side_name[side]);
  if (contact->count == 0) {
    mho_buffer_add(buffer, "no contact\n");
    return;
  }
  bool one = contact->channels == MHO_CHANNELS_ONE;
  for (int i = 0; i < contact->count; i++) {
    mho_buffer_print(buffer, "%s%s", i ? ", " : "", molecule->site[contact->site[i]].id);
    if (one && contact->amplitude[i] != 1.0) {
      mho_buffer_add(buffer, " x ");
      mho_buffer_number(buffer, digits, contact->amplitude[i]);
    }
  }
  mho_buffer_add(buffer, ", ");
  mho_write_electrode(contact, digits, buffer);
  mho_buffer_print(buffer, "%s\n",
                   contact->count > 1 ? one ? ", one channel" : ", independent channels" : "");
}

static void write_sites(const mho_molecule *molecule, int digits, mho_buffer *buffer)
{
  mho_buffer_add(buffer, "  site          element       onsite_eV  bonded to (hopping_eV, twist)\n");
  for (int i = 0; i < molecule->site_count; i++) {
    const mho_site *site = &molecule->site[i];
    const char *row = mho_parameters_row_name(molecule->parameters, site->row);
    char number[32];
    mho_number_write(number, sizeof number, digits, mho_molecule_onsite_ev(molecule, i));
    mho_buffer_print(buffer, "  %-12s  %-12s  %9s ", site->id, row ? row : "explicit", number);
    const char *before = " ";
    for (int b = 0; b < molecule->bond_count; b++) {
      const mho_bond *bond = &molecule->bond[b];
      if (bond->site[0] != i && bond->site[1] != i) continue;
      int other = bond->site[0] == i ? bond->site[1] : bond->site[0];
      mho_buffer_print(buffer, "%s%s (", before, molecule->site[other].id);
      mho_buffer_number(buffer, digits, mho_molecule_hopping_ev(molecule, b));
      if (bond->rotatable) {
        mho_buffer_add(buffer, ", ");
        mho_buffer_number(buffer, digits, bond->twist_deg);
        mho_buffer_add(buffer, " deg");
      }
      mho_buffer_add(buffer, ")");
      before = ", ";
    }
    mho_buffer_add(buffer, "\n");
  }
}

static const char *plural(int count) { return count == 1 ? "" : "s"; }

static mho_status write_molecule(const mho_checked *checked, int digits, mho_buffer *buffer)
{
  const mho_molecule *molecule = checked->molecule;
  const mho_junction *junction = checked->junction;
  double length;
  mho_length_kind kind;
  mho_status status = mho_molecule_length(molecule, &length, &kind);
  if (status != MHO_OK) return status;
  mho_buffer_print(buffer, "%s\n  %d pi site%s, %d bond%s, %d electron%s", molecule->name,
                   molecule->site_count, plural(molecule->site_count), molecule->bond_count,
                   plural(molecule->bond_count), molecule->electrons,
                   plural(molecule->electrons));
  if (molecule->charge) mho_buffer_print(buffer, ", charge %+d", molecule->charge);
  mho_buffer_add(buffer, "; beta ");
  mho_buffer_number(buffer, digits, molecule->beta_ev);
  mho_buffer_print(buffer, " eV, parameters %s\n  ",
                   mho_parameters_name(molecule->parameters));
  write_level(buffer, "HOMO", junction->has_homo, junction->homo_ev, digits);
  write_level(buffer, ", LUMO", junction->has_lumo, junction->lumo_ev, digits);
  write_level(buffer, ", Fermi level", true, junction->fermi_ev, digits);
  mho_buffer_add(buffer, " (relative to alpha)\n");
  for (int side = 0; side < 2; side++) write_contact(molecule, side, digits, buffer);
  for (int i = 0; i < molecule->linker_count; i++)
    mho_buffer_print(buffer, "%s%s at %s%s", i ? ", " : "  linkers   ",
                     molecule->linker[i].kind, molecule->site[molecule->linker[i].site].id,
                     i + 1 == molecule->linker_count ? "\n" : "");
  if (kind != MHO_LENGTH_NONE) {
    mho_buffer_add(buffer, "  length_nm ");
    mho_buffer_number(buffer, digits < 4 ? digits : 4, length);
    mho_buffer_add(buffer, kind == MHO_LENGTH_COORDINATES
                               ? " between the contacts, from the coordinates\n"
                               : " between the contacts, in an idealised plane\n");
  }
  write_sites(molecule, digits, buffer);
  for (int i = 0; i < molecule->notes.count; i++)
    mho_buffer_print(buffer, "  note: %s\n", molecule->notes.text[i]);
  for (int k = 0; k < MHO_WARNING_COUNT; k++)
    if (checked->warnings & (1u << k))
      mho_buffer_print(buffer, "  %s: %s\n", mho_warning_word(k), mho_warning_sentence(k));
  return MHO_OK;
}

mho_status mho_write_check_screen(const mho_checked *checked, size_t count, int digits,
                                  mho_buffer *buffer, mho_error *error)
{
  for (size_t i = 0; i < count; i++) {
    if (i) mho_buffer_add(buffer, "\n");
    if (write_molecule(&checked[i], digits, buffer) != MHO_OK)
      return mho_fail(error, MHO_ERR_MEMORY, "report", NULL, "out of memory");
  }
  return mho_buffer_check(buffer, "report", error);
}
