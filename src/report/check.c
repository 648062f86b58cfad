/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * `mho check`: what was understood of a molecule, as JSON and for the eye.
 */
#include <mho/quantity.h>
#include <mho/warning.h>

#include <math.h>
#include <string.h>

#include "report/json.h"
#include "report/stages.h"

static const char *const side_name[] = {"left", "right"};

static json_t *json_id_list(const mho_molecule *molecule, const int *site, int count)
{
  json_t *list = json_array();
  for (int i = 0; i < count; i++)
    json_array_append_new(list, json_string(molecule->site[site[i]].id));
  return list;
}

static json_t *json_site(const mho_molecule *molecule, int index)
{
  const mho_site *site = &molecule->site[index];
  const char *row = mho_parameters_row_name(molecule->parameters, site->row);
  json_t *object = json_object();
  json_object_set_new(object, "id", json_string(site->id));
  json_object_set_new(object, "element", row ? json_string(row) : json_null());
  json_object_set_new(object, "onsite_eV", json_real(mho_molecule_onsite_ev(molecule, index)));
  json_object_set_new(object, "electrons", row ? json_integer(site->electrons) : json_null());
  json_object_set_new(object, "x", json_null());
  json_object_set_new(object, "y", json_null());
  return object;
}

static json_t *json_bond(const mho_molecule *molecule, int index)
{
  const mho_bond *bond = &molecule->bond[index];
  json_t *object = json_object();
  json_object_set_new(object, "between", json_id_list(molecule, bond->site, 2));
  json_object_set_new(object, "hopping_eV",
                      json_real(mho_molecule_hopping_ev(molecule, index)));
  json_object_set_new(object, "twist_deg", json_real(bond->twist_deg));
  json_object_set_new(object, "rotatable", json_boolean(bond->rotatable));
  return object;
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
      json_array_append_new(amplitude, json_real(one ? contact->amplitude[i] : 1.0));
    json_object_set_new(object, "sites", json_id_list(molecule, contact->site, contact->count));
    json_object_set_new(object, "coupling_eV", json_real(contact->coupling_ev));
    json_object_set_new(object, "shift_eV", json_real(contact->shift_ev));
    json_object_set_new(object, "channels", json_string(one ? "one" : "independent"));
    json_object_set_new(object, "amplitude", amplitude);
    json_object_set_new(contacts, side_name[side], object);
  }
  return contacts;
}

static json_t *json_optional(bool present, double value)
{
  return present ? json_real(value) : json_null();
}

static json_t *json_molecule(const mho_checked *checked)
{
  const mho_molecule *molecule = checked->molecule;
  const mho_junction *junction = checked->junction;
  json_t *sites = json_array(), *bonds = json_array(), *levels = json_array();
  for (int i = 0; i < molecule->site_count; i++)
    json_array_append_new(sites, json_site(molecule, i));
  for (int b = 0; b < molecule->bond_count; b++)
    json_array_append_new(bonds, json_bond(molecule, b));
  for (int k = 0; k < junction->sites; k++)
    json_array_append_new(levels, json_real(junction->level_ev[k]));
  json_t *object = json_object();
  json_object_set_new(object, "name", json_string(molecule->name));
  json_object_set_new(object, "parameters",
                      json_string(mho_parameters_name(molecule->parameters)));
  json_object_set_new(object, "beta_eV", json_real(molecule->beta_ev));
  json_object_set_new(object, "temperature_K", json_real(molecule->temperature_k));
  json_object_set_new(object, "sites", sites);
  json_object_set_new(object, "bonds", bonds);
  json_object_set_new(object, "electrons", json_integer(molecule->electrons));
  json_object_set_new(object, "charge", json_integer(molecule->charge));
  json_object_set_new(object, "levels_eV", levels);
  json_object_set_new(object, "homo_eV", json_optional(junction->has_homo, junction->homo_ev));
  json_object_set_new(object, "lumo_eV", json_optional(junction->has_lumo, junction->lumo_ev));
  json_object_set_new(object, "fermi_eV", json_real(junction->fermi_ev));
  json_object_set_new(object, "linkers", json_array());
  json_object_set_new(object, "contacts", json_contacts(molecule));
  json_object_set_new(object, "warnings", mho_json_warning_words(checked->warnings));
  return object;
}

json_t *mho_json_molecules(const mho_checked *checked, size_t count)
{
  json_t *list = json_array();
  for (size_t i = 0; i < count; i++) json_array_append_new(list, json_molecule(&checked[i]));
  return list;
}

mho_status mho_write_check_json(const mho_checked *checked, size_t count, mho_buffer *buffer,
                                mho_error *error)
{
  json_t *object = json_object();
  json_object_set_new(object, "schema", json_string(MHO_JSON_SCHEMA));
  json_object_set_new(object, "molecules", mho_json_molecules(checked, count));
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
  mho_buffer_add(buffer, ", coupling ");
  mho_buffer_number(buffer, digits, contact->coupling_ev);
  mho_buffer_print(buffer, " eV%s\n",
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

static void write_molecule(const mho_checked *checked, int digits, mho_buffer *buffer)
{
  const mho_molecule *molecule = checked->molecule;
  const mho_junction *junction = checked->junction;
  mho_buffer_print(buffer, "%s\n  %d pi sites, %d bonds, %d electrons", molecule->name,
                   molecule->site_count, molecule->bond_count, molecule->electrons);
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
  write_sites(molecule, digits, buffer);
  for (int k = 0; k < MHO_WARNING_COUNT; k++)
    if (checked->warnings & (1u << k))
      mho_buffer_print(buffer, "  %s: %s\n", mho_warning_word(k), mho_warning_sentence(k));
}

mho_status mho_write_check_screen(const mho_checked *checked, size_t count, int digits,
                                  mho_buffer *buffer, mho_error *error)
{
  for (size_t i = 0; i < count; i++) {
    if (i) mho_buffer_add(buffer, "\n");
    write_molecule(&checked[i], digits, buffer);
  }
  return mho_buffer_check(buffer, "report", error);
}
