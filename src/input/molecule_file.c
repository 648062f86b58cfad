/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A molecule file: keys that are settings, and the pi sites themselves.
 */
#include <mho/molecule_file.h>

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "base/text.h"
#include "input/molecule_node.h"
#include "input/yaml.h"
#include "molecule/records.h"
#include "molecule/texts.h"

#define ENERGY_LIMIT_EV 100.0
#define COUPLING_LOW_EV 1e-9
#define COUPLING_HIGH_EV 10.0
#define CHAIN_LOW_EV 1e-6 /* of its hoppings */

enum { CHARGE_LIMIT = 20, RECORD_LIMIT = 1000000000 };

typedef struct {
  const mho_yaml *yaml;
  const mho_yaml_node *node; /* the mapping of the molecule */
  mho_molecule *molecule;
  mho_settings settings; /* of defaults, this mapping and overrides together */
  bool drawn;           /* a SMILES or a structure, not the sites themselves */
  bool explicit_energy; /* some site has an explicit onsite only */
} reader;

static bool fail_memory(const reader *r)
{
  mho_fail_at(r->yaml->error, MHO_ERR_MEMORY, "input", r->yaml->file, 0, 0, NULL,
              "out of memory");
  return false;
}

static bool is_id(const char *text)
{
  static const char *const letters = "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ";
  static const char *const others =
      "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789_";
  return *text && strchr(letters, *text) && strspn(text, others) == strlen(text) &&
         strlen(text) < MHO_ID_SIZE;
}

/* What stands in the mapping goes on top of the defaults, and the overrides on
 * top of both. */
static bool read_settings(reader *r, const mho_settings *defaults,
                          const mho_settings *overrides)
{
  mho_settings own = {0};
  mho_yaml_get_settings(r->yaml, r->node, &own);
  mho_yaml_get_twists(r->yaml, mho_yaml_find(r->node, "twist"), &own);
  bool good = mho_settings_merge(&r->settings, defaults) == MHO_OK &&
              mho_settings_merge(&r->settings, &own) == MHO_OK &&
              mho_settings_merge(&r->settings, overrides) == MHO_OK;
  r->molecule->own_parameters = own.own_parameters;
  own.own_parameters = NULL;
  mho_settings_clear(&own);
  if (r->settings.parameters) r->molecule->parameters = r->settings.parameters;
  return good ? true : fail_memory(r);
}

static void read_name(reader *r)
{
  const char *text, *path = r->yaml->file;
  const mho_yaml_node *node = mho_yaml_find(r->node, "name");
  bool whole_file = r->node == r->yaml->root;
  if (mho_yaml_get_text(r->yaml, node, "name", &text)) {
    r->molecule->name = mho_copy_text(text);
  } else if (!whole_file) {
    return; /* a structure inside a study is called by its text */
  } else {
    const char *slash = strrchr(path, '/'), *stem = slash ? slash + 1 : path;
    const char *dot = strrchr(stem, '.');
    size_t length = dot && dot > stem ? (size_t)(dot - stem) : strlen(stem);
    r->molecule->name = mho_print_text("%.*s", (int)length, stem);
  }
  if (!r->molecule->name) fail_memory(r);
}

/* Row of the parameter set that a site names. */
static void read_element(reader *r, const mho_yaml_node *node, mho_site *site)
{
  const mho_parameter_set *set = r->molecule->parameters;
  const char *text;
  if (!mho_yaml_get_text(r->yaml, node, "element", &text)) return;
  site->row = mho_parameters_find(set, text);
  if (site->row >= 0) {
    site->electrons = mho_parameters_electrons(set, site->row);
    return;
  }
  const char *row[MHO_ROW_LIMIT];
  size_t count = 0;
  for (int i = 0; i < mho_parameters_count(set) && count < MHO_ROW_LIMIT; i++)
    row[count++] = mho_parameters_row_name(set, i);
  const char *nearest = mho_nearest_word(text, row, count);
  char list[320];
  if (nearest)
    mho_yaml_fail(r->yaml, node, MHO_ERR_UNPARAMETERISED, "element",
                  "element: '%.40s' is not a row of %s; did you mean '%s'?", text,
                  mho_parameters_name(set), nearest);
  else
    mho_yaml_fail(r->yaml, node, MHO_ERR_UNPARAMETERISED, "element",
                  "element: '%.40s' is not a row of %s; allowed are %s", text,
                  mho_parameters_name(set), mho_join_words(row, count, list, sizeof list));
}

static void read_site(reader *r, const mho_yaml_node *node, mho_site *site)
{
  static const char *const keys[] = {"id", "element", "onsite"};
  *site = (mho_site){.row = -1};
  if (!mho_yaml_is(r->yaml, node, MHO_YAML_MAPPING, "a site")) return;
  mho_yaml_check_keys(r->yaml, node, keys, 3);
  const mho_yaml_node *id = mho_yaml_require(r->yaml, node, "id");
  const char *text;
  if (mho_yaml_get_text(r->yaml, id, "id", &text)) {
    if (!is_id(text))
      mho_yaml_fail(r->yaml, id, MHO_ERR_SYNTAX, "id",
                    "id: '%.40s' is not allowed; write a letter, then letters, digits or _, "
                    "at most %d characters",
                    text, MHO_ID_SIZE - 1);
    else if (mho_molecule_find_site(r->molecule, text) >= 0)
      mho_yaml_fail(r->yaml, id, MHO_ERR_KEY, "id", "id: site '%s' exists already", text);
    else
      snprintf(site->id, sizeof site->id, "%s", text);
  }
  const mho_yaml_node *element = mho_yaml_find(node, "element");
  const mho_yaml_node *onsite = mho_yaml_find(node, "onsite");
  if (!element && !onsite)
    mho_yaml_fail(r->yaml, node, MHO_ERR_KEY, "element",
                  "a site needs an 'element' such as C or an 'onsite' energy");
  read_element(r, element, site);
  site->explicit_onsite =
      mho_yaml_get_quantity(r->yaml, onsite, "onsite", MHO_ENERGY, -ENERGY_LIMIT_EV,
                            ENERGY_LIMIT_EV, &site->onsite_ev);
  if (onsite) r->explicit_energy = true;
}

static void read_sites(reader *r)
{
  const mho_yaml_node *list = mho_yaml_require(r->yaml, r->node, "sites");
  if (!mho_yaml_is(r->yaml, list, MHO_YAML_LIST, "sites")) return;
  if (list->count < 1 || list->count > MHO_SITE_LIMIT) {
    mho_yaml_fail(r->yaml, list, MHO_ERR_LIMIT, "sites",
                  "sites: %zu are given; allowed are 1 to %d", list->count, MHO_SITE_LIMIT);
    return;
  }
  r->molecule->site = calloc(list->count, sizeof *r->molecule->site);
  if (!r->molecule->site) {
    fail_memory(r);
    return;
  }
  for (size_t i = 0; i < list->count; i++) {
    read_site(r, list->item[i], &r->molecule->site[i]);
    r->molecule->site_count++;
  }
}

/* Index of the site that a text names; a dangling name is an error. */
static bool read_site_name(reader *r, const mho_yaml_node *node, const char *field, int *site)
{
  const char *text;
  if (!mho_yaml_get_text(r->yaml, node, field, &text)) return false;
  *site = mho_molecule_find_site(r->molecule, text);
  if (*site >= 0) return true;
  const char *nearest = NULL, **id = malloc((size_t)(r->molecule->site_count + 1) * sizeof *id);
  if (id) {
    for (int i = 0; i < r->molecule->site_count; i++) id[i] = r->molecule->site[i].id;
    nearest = mho_nearest_word(text, id, (size_t)r->molecule->site_count);
  }
  mho_yaml_fail(r->yaml, node, MHO_ERR_REFERENCE, field,
                nearest ? "%s: there is no site '%.40s'; did you mean '%s'?"
                        : "%s: there is no site '%.40s' under 'sites'",
                field, text, nearest);
  free(id);
  return false;
}

static bool read_ends(reader *r, const mho_yaml_node *node, mho_bond *bond)
{
  const mho_yaml_node *between = mho_yaml_require(r->yaml, node, "between");
  if (!mho_yaml_is(r->yaml, between, MHO_YAML_LIST, "between")) return false;
  if (between->count != 2) {
    mho_yaml_fail(r->yaml, between, MHO_ERR_SYNTAX, "between",
                  "between: %zu sites are given; a bond joins two, such as [a1, a2]",
                  between->count);
    return false;
  }
  bool first = read_site_name(r, between->item[0], "between", &bond->site[0]);
  bool second = read_site_name(r, between->item[1], "between", &bond->site[1]);
  if (!first || !second) return false;
  if (bond->site[0] == bond->site[1]) {
    mho_yaml_fail(r->yaml, between, MHO_ERR_REFERENCE, "between",
                  "between: site '%s' is bonded to itself; a bond joins two sites",
                  between->item[0]->text);
    return false;
  }
  for (int b = 0; b < r->molecule->bond_count; b++) {
    const int *other = r->molecule->bond[b].site;
    if ((other[0] == bond->site[0] && other[1] == bond->site[1]) ||
        (other[0] == bond->site[1] && other[1] == bond->site[0])) {
      mho_yaml_fail(r->yaml, between, MHO_ERR_KEY, "between",
                    "between: the bond %s-%s is given twice", between->item[0]->text,
                    between->item[1]->text);
      return false;
    }
  }
  return true;
}

static void read_bond(reader *r, const mho_yaml_node *node)
{
  static const char *const keys[] = {"between", "hopping", "twist"};
  mho_bond bond = {.strength = 1.0};
  if (!mho_yaml_is(r->yaml, node, MHO_YAML_MAPPING, "a bond")) return;
  mho_yaml_check_keys(r->yaml, node, keys, 3);
  bool ends = read_ends(r, node, &bond);
  const mho_yaml_node *hopping = mho_yaml_find(node, "hopping");
  bond.explicit_hopping =
      mho_yaml_get_quantity(r->yaml, hopping, "hopping", MHO_ENERGY, -ENERGY_LIMIT_EV,
                            ENERGY_LIMIT_EV, &bond.hopping_ev);
  const mho_yaml_node *twist = mho_yaml_find(node, "twist");
  bond.rotatable = twist != NULL;
  mho_yaml_get_quantity(r->yaml, twist, "twist", MHO_ANGLE, -360.0, 360.0, &bond.twist_deg);
  if (!ends) return;
  for (int end = 0; !hopping && end < 2; end++) {
    const mho_site *site = &r->molecule->site[bond.site[end]];
    if (site->row < 0 && site->explicit_onsite) {
      mho_yaml_fail(r->yaml, node, MHO_ERR_KEY, "hopping",
                    "key 'hopping' is missing here: site '%s' has no element to take it from",
                    site->id);
      break;
    }
  }
  r->molecule->bond[r->molecule->bond_count++] = bond;
}

static void read_bonds(reader *r)
{
  const mho_yaml_node *list = mho_yaml_require(r->yaml, r->node, "bonds");
  if (!mho_yaml_is(r->yaml, list, MHO_YAML_LIST, "bonds")) return;
  r->molecule->bond = calloc(list->count + 1, sizeof *r->molecule->bond);
  if (!r->molecule->bond) {
    fail_memory(r);
    return;
  }
  for (size_t i = 0; i < list->count; i++) read_bond(r, list->item[i]);
}

static int read_charge(reader *r)
{
  long charge = 0;
  mho_yaml_get_integer(r->yaml, mho_yaml_find(r->node, "charge"), "charge", -CHARGE_LIMIT,
                       CHARGE_LIMIT, &charge);
  return (int)charge;
}

static void read_electrons(reader *r)
{
  mho_molecule *m = r->molecule;
  const mho_yaml_node *electrons = mho_yaml_find(r->node, "electrons");
  long count = 0;
  m->charge = read_charge(r);
  m->explicit_electrons = mho_yaml_get_integer(r->yaml, electrons, "electrons", 0,
                                               2L * m->site_count, &count);
  if (m->explicit_electrons) m->electrons = (int)count;
  if (electrons) return;
  if (r->explicit_energy) {
    mho_yaml_fail(r->yaml, r->node, MHO_ERR_KEY, "electrons",
                  "key 'electrons' is missing here: it is needed where a site has an explicit "
                  "'onsite'");
    return;
  }
  m->electrons = -m->charge;
  for (int i = 0; i < m->site_count; i++) m->electrons += m->site[i].electrons;
  const mho_yaml_node *node = mho_yaml_find(r->node, "charge");
  if (node && (m->electrons < 0 || m->electrons > 2 * m->site_count))
    mho_yaml_fail(r->yaml, node, MHO_ERR_RANGE, "charge",
                  "charge: it leaves %d electrons; allowed are 0 to %d", m->electrons,
                  2 * m->site_count);
}

static void read_contact_sites(reader *r, const mho_yaml_node *node, mho_contact *contact)
{
  const mho_yaml_node *list = mho_yaml_require(r->yaml, node, "sites");
  if (!mho_yaml_is(r->yaml, list, MHO_YAML_LIST, "sites")) return;
  if (list->count < 1) {
    mho_yaml_fail(r->yaml, list, MHO_ERR_LIMIT, "sites", "sites: a contact needs a site");
    return;
  }
  contact->site = calloc(list->count, sizeof *contact->site);
  contact->amplitude = calloc(list->count, sizeof *contact->amplitude);
  if (!contact->site || !contact->amplitude) {
    fail_memory(r);
    return;
  }
  for (size_t i = 0; i < list->count; i++) {
    int site;
    if (!read_site_name(r, list->item[i], "sites", &site)) continue;
    for (int k = 0; k < contact->count; k++)
      if (contact->site[k] == site)
        mho_yaml_fail(r->yaml, list->item[i], MHO_ERR_KEY, "sites",
                      "sites: '%s' is given twice in one contact", list->item[i]->text);
    contact->site[contact->count] = site;
    contact->amplitude[contact->count++] = 1.0;
  }
}

static void read_amplitudes(reader *r, const mho_yaml_node *node, mho_contact *contact)
{
  const mho_yaml_node *list = mho_yaml_find(node, "amplitude");
  if (!mho_yaml_is(r->yaml, list, MHO_YAML_LIST, "amplitude")) return;
  if (contact->channels != MHO_CHANNELS_ONE) {
    mho_yaml_fail(r->yaml, list, MHO_ERR_KEY, "amplitude",
                  "amplitude: it belongs to 'channels: one', where it is coherent");
    return;
  }
  if (list->count != (size_t)contact->count) {
    mho_yaml_fail(r->yaml, list, MHO_ERR_RANGE, "amplitude",
                  "amplitude: %zu values for %d sites; one a site is needed", list->count,
                  contact->count);
    return;
  }
  bool all_zero = true;
  for (size_t i = 0; i < list->count; i++) {
    mho_yaml_get_number(r->yaml, list->item[i], "amplitude", -100.0, 100.0,
                        &contact->amplitude[i]);
    if (contact->amplitude[i] != 0.0) all_zero = false;
  }
  if (all_zero)
    mho_yaml_fail(r->yaml, list, MHO_ERR_RANGE, "amplitude",
                  "amplitude: all are zero, so the contact touches nothing");
}

/* An energy that must not vanish. */
static void read_hopping(reader *r, const mho_yaml_node *mapping, const char *key,
                         const char *without, double *value)
{
  const mho_yaml_node *node = mho_yaml_require(r->yaml, mapping, key);
  if (!mho_yaml_get_quantity(r->yaml, node, key, MHO_ENERGY, -ENERGY_LIMIT_EV, ENERGY_LIMIT_EV,
                             value) ||
      fabs(*value) >= CHAIN_LOW_EV)
    return;
  mho_yaml_fail(r->yaml, node, MHO_ERR_RANGE, key,
                "%s: with '%.40s' %s; allowed are sizes of %g eV to %g eV", key, node->text, without,
                CHAIN_LOW_EV, ENERGY_LIMIT_EV);
}

static void read_chain(reader *r, const mho_yaml_node *contact_node, mho_contact *contact)
{
  static const char *const keys[] = {"centre", "hopping", "joint"};
  static const char *const excluded[] = {"coupling", "shift"};
  const mho_yaml_node *node = mho_yaml_find(contact_node, "chain");
  if (!mho_yaml_is(r->yaml, node, MHO_YAML_MAPPING, "chain")) return;
  mho_yaml_check_keys(r->yaml, node, keys, sizeof keys / sizeof *keys);
  for (int i = 0; i < 2; i++) {
    const mho_yaml_node *other = mho_yaml_find(contact_node, excluded[i]);
    if (other)
      mho_yaml_fail(r->yaml, other, MHO_ERR_KEY, excluded[i],
                    "%s: it is of a wide band and does not go with 'chain', which has its own",
                    excluded[i]);
  }
  contact->has_chain = true;
  contact->line = node->line;
  contact->column = node->column;
  mho_yaml_get_quantity(r->yaml, mho_yaml_find(node, "centre"), "centre", MHO_ENERGY,
                        -ENERGY_LIMIT_EV, ENERGY_LIMIT_EV, &contact->chain.center_ev);
  read_hopping(r, node, "hopping", "the chain has no band", &contact->chain.hopping_ev);
  read_hopping(r, node, "joint", "nothing joins chain and molecule", &contact->chain.joint_ev);
}

/* What stands behind a contact: a wide band or a chain. */
static void read_electrode(reader *r, const mho_yaml_node *node, mho_contact *contact)
{
  mho_yaml_get_quantity(r->yaml, mho_yaml_find(node, "coupling"), "coupling", MHO_ENERGY,
                        COUPLING_LOW_EV, COUPLING_HIGH_EV, &contact->coupling_ev);
  mho_yaml_get_quantity(r->yaml, mho_yaml_find(node, "shift"), "shift", MHO_ENERGY, -10.0,
                        10.0, &contact->shift_ev);
  read_chain(r, node, contact);
}

static void read_contact(reader *r, const mho_yaml_node *node, const char *field,
                         mho_contact *contact)
{
  static const char *const keys[] = {"coupling", "shift", "chain", "sites", "channels",
                                     "amplitude"};
  static const char *const channels[] = {"independent", "one"};
  if (!mho_yaml_is(r->yaml, node, MHO_YAML_MAPPING, field)) return;
  mho_yaml_check_keys(r->yaml, node, keys, sizeof keys / sizeof *keys);
  for (size_t i = 3; r->drawn && i < sizeof keys / sizeof *keys; i++) {
    const mho_yaml_node *own = mho_yaml_find(node, keys[i]);
    if (own)
      mho_yaml_fail(r->yaml, own, MHO_ERR_KEY, keys[i],
                    "%s: a drawn structure has its contacts at linkers or at atoms of class 1 and 2; "
                    "allowed here: coupling, shift, chain", keys[i]);
  }
  read_electrode(r, node, contact);
  if (r->drawn) return;
  read_contact_sites(r, node, contact);
  size_t choice = 0;
  if (mho_yaml_get_choice(r->yaml, mho_yaml_find(node, "channels"), "channels", channels, 2,
                          &choice))
    contact->channels = choice == 1 ? MHO_CHANNELS_ONE : MHO_CHANNELS_INDEPENDENT;
  read_amplitudes(r, node, contact);
}

static void read_electrodes(reader *r)
{
  static const char *const keys[] = {"left", "right"};
  const mho_yaml_node *node = mho_yaml_find(r->node, "electrodes");
  if (!mho_yaml_is(r->yaml, node, MHO_YAML_MAPPING, "electrodes")) return;
  mho_yaml_check_keys(r->yaml, node, keys, 2);
  for (int side = 0; side < 2; side++)
    read_contact(r, (r->drawn ? mho_yaml_find(node, keys[side])
                              : mho_yaml_require(r->yaml, node, keys[side])),
                 keys[side], &r->molecule->contact[side]);
  const mho_yaml_node *coupling = mho_yaml_find(r->node, "coupling");
  if (coupling && r->molecule->contact[MHO_LEFT].has_chain &&
      r->molecule->contact[MHO_RIGHT].has_chain)
    mho_yaml_fail(r->yaml, coupling, MHO_ERR_KEY, "coupling",
                  "coupling: both electrodes are chains, which have none; leave it out");
}

/* A coupling from outside counts more than the file's electrodes. */
static void override_electrodes(reader *r, const mho_settings *overrides)
{
  mho_contact *contact = r->molecule->contact;
  if (!overrides || !overrides->has_coupling) return;
  if ((contact[MHO_LEFT].has_chain || contact[MHO_RIGHT].has_chain) &&
      mho_texts_add(&r->molecule->notes, "the coupling that is asked for puts wide bands in the "
                                         "place of the file's chains") != MHO_OK)
    fail_memory(r);
  mho_settings above = {.has_coupling = true, .coupling_ev = overrides->coupling_ev};
  mho_status status = mho_settings_apply(&above, r->molecule, r->yaml->error);
  (void)status; /* a coupling always fits */
}

/* The sites themselves. */
static void read_explicit(reader *r, const mho_settings *overrides)
{
  read_sites(r);
  read_bonds(r);
  read_electrons(r);
  mho_settings below = r->settings; /* a contact's own coupling counts more */
  below.twist_count = 0;
  if (mho_settings_apply(&below, r->molecule, r->yaml->error) != MHO_OK) return;
  read_electrodes(r);
  if (r->yaml->error->count) return; /* sites may be missing */
  override_electrodes(r, overrides);
  mho_settings twists = {.twist = r->settings.twist, .twist_count = r->settings.twist_count};
  mho_status status = mho_settings_apply(&twists, r->molecule, r->yaml->error);
  (void)status; /* the cause is in the document's error */
  if (mho_molecule_warn_length(r->molecule) != MHO_OK) fail_memory(r);
}

static void read_drawn(reader *r, const mho_yaml_node *smiles)
{
  const char *text;
  int charge = read_charge(r);
  if (!mho_yaml_get_text(r->yaml, smiles, "smiles", &text)) return;
  mho_place place = {r->yaml->file, smiles->line, smiles->column + smiles->quoted, false};
  mho_status status = mho_molecule_read_smiles(text, &place, &r->settings, charge, r->molecule,
                                               r->yaml->error);
  (void)status; /* the cause is in the document's error */
  r->molecule->smiles = mho_copy_text(text);
  if (!r->molecule->smiles) fail_memory(r);
}

/* A molfile, an SDF or an XYZ file beside this one. */
static void read_structure(reader *r, const mho_yaml_node *structure)
{
  const char *name;
  long record = 0;
  int charge = read_charge(r);
  mho_yaml_get_integer(r->yaml, mho_yaml_find(r->node, "record"), "record", 1, RECORD_LIMIT, &record);
  if (!mho_yaml_get_text(r->yaml, structure, "structure", &name)) return;
  if (!mho_records_is_file_name(name)) {
    mho_yaml_fail(r->yaml, structure, MHO_ERR_FILE, "structure",
                  "structure: '%.100s' is not known by its ending; allowed are .mol, .sdf and .xyz",
                  name);
    return;
  }
  char *path = mho_path_beside(r->yaml->file, name);
  if (!path) {
    fail_memory(r);
    return;
  }
  mho_status status = MHO_OK;
  if (access(path, R_OK) != 0)
    mho_yaml_fail(r->yaml, structure, MHO_ERR_FILE, "structure",
                  "structure: '%.200s' cannot be read; paths are relative to this file", name);
  else
    status = mho_molecule_read_structure(path, record, &r->settings, charge, r->molecule,
                                         r->yaml->error);
  (void)status; /* the cause is in the document's error */
  free(path);
}

static void refuse_mixture(reader *r, const char *with)
{
  static const char *const keys[] = {"sites", "bonds", "electrons", "smiles"};
  for (int i = 0; i < 4; i++) {
    const mho_yaml_node *node = mho_yaml_find(r->node, keys[i]);
    if (node && strcmp(keys[i], with))
      mho_yaml_fail(r->yaml, node, MHO_ERR_KEY, keys[i],
                    "key '%s' does not go with '%s'; give the structure or the sites", keys[i],
                    with);
  }
}

static void read_molecule(reader *r, const mho_settings *defaults,
                          const mho_settings *overrides)
{
  static const char *const keys[] = {
      "name", "smiles", "sites",      "bonds",       "electrons", "charge",      "electrodes",
      "fermi", "twist", "parameters", "alternation", "alkyl",     "beta", "temperature",
      "coupling", "structure", "record", "hopping", "torsion"};
  int before = r->yaml->error->count;
  const mho_yaml_node *study = mho_yaml_find(r->node, "study");
  if (study && mho_yaml_find(r->node, "molecules")) {
    mho_yaml_fail(r->yaml, study, MHO_ERR_KEY, "study",
                  "this is a study, not a molecule; mho run takes it");
    return;
  }
  mho_yaml_check_keys(r->yaml, r->node, keys, sizeof keys / sizeof *keys);
  if (!read_settings(r, defaults, overrides)) return;
  read_name(r);
  const mho_yaml_node *smiles = mho_yaml_find(r->node, "smiles");
  const mho_yaml_node *structure = mho_yaml_find(r->node, "structure");
  const mho_yaml_node *record = mho_yaml_find(r->node, "record");
  if (record && !structure)
    mho_yaml_fail(r->yaml, record, MHO_ERR_KEY, "record", "record: it belongs to a 'structure'");
  if (structure || smiles) refuse_mixture(r, structure ? "structure" : "smiles");
  r->drawn = structure || smiles;
  if (structure) read_structure(r, structure);
  else if (smiles) read_drawn(r, smiles);
  else if (mho_yaml_find(r->node, "sites") || mho_yaml_find(r->node, "bonds"))
    read_explicit(r, overrides);
  else
    mho_yaml_fail(r->yaml, r->node, MHO_ERR_KEY, "smiles",
                  "one of the keys 'smiles', 'structure' or 'sites' is missing here");
  if (r->drawn) read_electrodes(r);
  if (r->drawn) override_electrodes(r, overrides);
  if (r->yaml->error->count == before)
    mho_yaml_get_torsions(r->yaml, mho_yaml_find(r->node, "torsion"), r->molecule);
}

mho_status mho_molecule_read_node(const mho_yaml *document, const mho_yaml_node *node,
                                  const mho_settings *defaults,
                                  const mho_settings *overrides, mho_molecule *molecule)
{
  reader r = {.yaml = document, .node = node, .molecule = molecule};
  int before = document->error->count + document->error->suppressed;
  molecule->source = mho_copy_text(document->file);
  if (!molecule->source) fail_memory(&r);
  else read_molecule(&r, defaults, overrides);
  mho_settings_clear(&r.settings);
  mho_error *error = document->error;
  if (error->count + error->suppressed == before) return MHO_OK;
  return before < error->count ? error->cause[before].status : MHO_ERR_KEY;
}

mho_status mho_molecule_read(const char *path, const mho_settings *defaults,
                             const mho_settings *overrides, mho_molecule *molecule,
                             mho_error *error)
{
  mho_error own;
  if (!error) {
    mho_error_init(&own);
    error = &own;
  }
  mho_molecule_init(molecule);
  mho_yaml document;
  mho_status status = mho_yaml_read(path, &document, error);
  /* A key given twice does not stop the search for further mistakes. */
  if (status == MHO_OK || (status == MHO_ERR_KEY && document.root)) {
    mho_status read =
        mho_molecule_read_node(&document, document.root, defaults, overrides, molecule);
    if (status == MHO_OK) status = read;
  }
  mho_yaml_clear(&document);
  return status;
}
