/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <mho/molecule_file.h>
#include <mho/quantity.h>
#include <mho/settings.h>

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/text.h"

enum { BETA, TEMPERATURE, COUPLING, FERMI, PARAMETERS, ALTERNATION, ALKYL, HOPPING, SETTING_COUNT };

static const char *const names[SETTING_COUNT] = {
    [BETA] = "beta", [TEMPERATURE] = "temperature", [COUPLING] = "coupling",
    [FERMI] = "fermi", [PARAMETERS] = "parameters", [ALTERNATION] = "alternation",
    [ALKYL] = "alkyl", [HOPPING] = "hopping"};

static const char *const alternation_names[] = {
    [MHO_ALTERNATION_FORMAL] = "formal", [MHO_ALTERNATION_NONE] = "none"};
static const char *const alkyl_names[] = {[MHO_ALKYL_IGNORED] = "ignored",
                                          [MHO_ALKYL_INDUCTIVE] = "inductive",
                                          [MHO_ALKYL_HETEROATOM] = "heteroatom"};
static const char *const hopping_names[] = {[MHO_HOPPING_TABLE] = "table",
                                            [MHO_HOPPING_BOND_LENGTH] = "bond-length"};

static const struct {
  mho_dimension dimension;
  double low, high;
} quantities[] = {
    [BETA] = {MHO_ENERGY, -10.0, -0.01},
    [TEMPERATURE] = {MHO_TEMPERATURE, 0.0, 3000.0},
    [COUPLING] = {MHO_ENERGY, 1e-9, 10.0},
};

#define FERMI_LIMIT_EV 100.0

const char *const *mho_settings_names(size_t *count)
{
  *count = SETTING_COUNT;
  return names;
}

static mho_status read_quantity(int which, const char *text, double *value, char *reason,
                                size_t size)
{
  double read;
  mho_status status =
      mho_quantity_read(text, quantities[which].dimension, &read, reason, size);
  if (status != MHO_OK) return status;
  double low = quantities[which].low, high = quantities[which].high;
  if (!(read >= low && read <= high)) {
    const char *unit = mho_dimension_base_unit(quantities[which].dimension);
    snprintf(reason, size, "'%.40s' is out of range; allowed are %g %s to %g %s", text, low,
             unit, high, unit);
    return MHO_ERR_RANGE;
  }
  *value = read;
  return MHO_OK;
}

/* A built-in set, or a file where the text looks like a path. */
static mho_status read_parameters(mho_settings *s, const char *text, const char *beside,
                                  char *reason, size_t size, mho_error *error)
{
  const mho_parameter_set *builtin = mho_parameters_builtin(text);
  if (builtin) {
    s->parameters = builtin;
    return MHO_OK;
  }
  if (!strpbrk(text, "./")) {
    size_t count;
    const char *const *known = mho_parameters_names(&count);
    char list[160];
    snprintf(reason, size, "parameter set '%.40s' is not known; allowed are %s or a file such "
             "as my-set.yaml", text, mho_join_words(known, count, list, sizeof list));
    return MHO_ERR_REFERENCE;
  }
  char *path = mho_path_beside(beside, text);
  mho_parameter_set *set = NULL;
  mho_status status = path ? mho_parameters_read(path, &set, error) : MHO_ERR_MEMORY;
  free(path);
  if (status != MHO_OK) {
    snprintf(reason, size, "parameter file '%.200s' cannot be used", text);
    return status;
  }
  mho_parameters_free(s->own_parameters);
  s->parameters = s->own_parameters = set;
  return MHO_OK;
}

static mho_status read_choice(const char *text, const char *const *choices, size_t count,
                              int *choice, char *reason, size_t size)
{
  for (size_t i = 0; i < count; i++)
    if (!strcmp(choices[i], text)) {
      *choice = (int)i;
      return MHO_OK;
    }
  char list[160];
  snprintf(reason, size, "'%.40s' is not known; allowed are %s", text,
           mho_join_words(choices, count, list, sizeof list));
  return MHO_ERR_REFERENCE;
}

void mho_settings_clear(mho_settings *settings)
{
  mho_parameters_free(settings->own_parameters);
  free(settings->twist);
  *settings = (mho_settings){0};
}

mho_status mho_settings_read(mho_settings *s, const char *name, const char *text,
                             const char *beside, char *reason, size_t size, mho_error *error)
{
  mho_status status;
  int which = 0, choice = 0;
  while (which < SETTING_COUNT && strcmp(name, names[which])) which++;
  switch (which) {
  case BETA:
    status = read_quantity(BETA, text, &s->beta_ev, reason, size);
    s->has_beta |= status == MHO_OK;
    return status;
  case TEMPERATURE:
    status = read_quantity(TEMPERATURE, text, &s->temperature_k, reason, size);
    s->has_temperature |= status == MHO_OK;
    return status;
  case COUPLING:
    status = read_quantity(COUPLING, text, &s->coupling_ev, reason, size);
    s->has_coupling |= status == MHO_OK;
    return status;
  case FERMI:
    status = mho_fermi_read(text, &s->fermi, reason, size);
    s->has_fermi |= status == MHO_OK;
    return status;
  case PARAMETERS: return read_parameters(s, text, beside, reason, size, error);
  case ALTERNATION:
    status = read_choice(text, alternation_names, 2, &choice, reason, size);
    if (status != MHO_OK) return status;
    s->alternation = (mho_alternation)choice;
    s->has_alternation = true;
    return MHO_OK;
  case ALKYL:
    status = read_choice(text, alkyl_names, 3, &choice, reason, size);
    if (status != MHO_OK) return status;
    s->alkyl = (mho_alkyl)choice;
    s->has_alkyl = true;
    return MHO_OK;
  case HOPPING:
    status = read_choice(text, hopping_names, 2, &choice, reason, size);
    if (status != MHO_OK) return status;
    s->hopping = (mho_hopping)choice;
    s->has_hopping = true;
    return MHO_OK;
  default: snprintf(reason, size, "'%.40s' is not a setting", name); return MHO_ERR_KEY;
  }
}

static mho_status add_twist(mho_settings *settings, const mho_twist *twist)
{
  mho_twist *larger =
      realloc(settings->twist, (size_t)(settings->twist_count + 1) * sizeof *larger);
  if (!larger) return MHO_ERR_MEMORY;
  settings->twist = larger;
  settings->twist[settings->twist_count++] = *twist;
  return MHO_OK;
}

mho_status mho_settings_read_twist(mho_settings *settings, const char *bond, const char *angle,
                                   char *reason, size_t size)
{
  mho_twist twist;
  const char *dash = strchr(bond, '-');
  size_t first = dash ? (size_t)(dash - bond) : 0, second = dash ? strlen(dash + 1) : 0;
  if (first == 0 || second == 0 || first >= MHO_ID_SIZE || second >= MHO_ID_SIZE ||
      strpbrk(dash + 1, "- ")) {
    snprintf(reason, size, "'%.40s' is not a bond; write two sites such as C5-C8", bond);
    return MHO_ERR_SYNTAX;
  }
  snprintf(twist.site[0], MHO_ID_SIZE, "%.*s", (int)first, bond);
  snprintf(twist.site[1], MHO_ID_SIZE, "%s", dash + 1);
  mho_status status =
      mho_quantity_read(angle, MHO_ANGLE, &twist.angle_deg, reason, size);
  if (status != MHO_OK) return status;
  if (!(twist.angle_deg >= -360.0 && twist.angle_deg <= 360.0)) {
    snprintf(reason, size, "'%.40s' is out of range; allowed are -360 deg to 360 deg", angle);
    return MHO_ERR_RANGE;
  }
  status = add_twist(settings, &twist);
  if (status != MHO_OK) snprintf(reason, size, "out of memory");
  return status;
}

mho_status mho_settings_merge(mho_settings *s, const mho_settings *over)
{
  if (!over) return MHO_OK;
  if (over->has_beta) s->beta_ev = over->beta_ev;
  if (over->has_temperature) s->temperature_k = over->temperature_k;
  if (over->has_coupling) s->coupling_ev = over->coupling_ev;
  if (over->has_fermi) s->fermi = over->fermi;
  if (over->has_alternation) s->alternation = over->alternation;
  if (over->has_alkyl) s->alkyl = over->alkyl;
  if (over->has_hopping) s->hopping = over->hopping;
  if (over->parameters) s->parameters = over->parameters;
  s->has_beta |= over->has_beta;
  s->has_temperature |= over->has_temperature;
  s->has_coupling |= over->has_coupling;
  s->has_fermi |= over->has_fermi;
  s->has_alternation |= over->has_alternation;
  s->has_alkyl |= over->has_alkyl;
  s->has_hopping |= over->has_hopping;
  s->contacts_optional |= over->contacts_optional;
  for (int i = 0; i < over->twist_count; i++)
    if (add_twist(s, &over->twist[i]) != MHO_OK) return MHO_ERR_MEMORY;
  return MHO_OK;
}

static const char *skip_blanks(const char *s)
{
  while (*s == ' ' || *s == '\t') s++;
  return s;
}

/* Behind the word if s begins with it, else NULL. */
static const char *after_word(const char *s, const char *word)
{
  size_t length = strlen(word);
  return strncmp(s, word, length) ? NULL : s + length;
}

/* `+ 1.2 eV` or `- 0.3 eV` behind `homo` and `lumo`; absent is zero. */
static mho_status read_offset(const char *s, double *offset, char *reason, size_t size)
{
  *offset = 0.0;
  s = skip_blanks(s);
  if (!*s) return MHO_OK;
  const char *minus = after_word(s, "\xE2\x88\x92"); /* U+2212 */
  double sign = *s == '+' ? 1.0 : *s == '-' || minus ? -1.0 : 0.0;
  if (sign == 0.0) {
    snprintf(reason, size, "'%.40s' is not understood; write 'homo + 1.2 eV'", s);
    return MHO_ERR_SYNTAX;
  }
  s = skip_blanks(minus ? minus : s + 1);
  double value;
  mho_status status = mho_quantity_read(s, MHO_ENERGY, &value, reason, size);
  *offset = sign * value;
  return status;
}

mho_status mho_fermi_read(const char *text, mho_fermi *fermi, char *reason, size_t size)
{
  mho_fermi read = {0};
  const char *s = skip_blanks(text), *rest;
  mho_status status;
  if (!strcmp(s, "midgap")) {
    read.kind = MHO_FERMI_MIDGAP;
    status = MHO_OK;
  } else if ((rest = after_word(s, "homo"))) {
    read.kind = MHO_FERMI_HOMO;
    status = read_offset(rest, &read.offset_ev, reason, size);
  } else if ((rest = after_word(s, "lumo"))) {
    read.kind = MHO_FERMI_LUMO;
    status = read_offset(rest, &read.offset_ev, reason, size);
  } else {
    status = mho_quantity_read(s, MHO_ENERGY, &read.offset_ev, reason, size);
    if (status == MHO_ERR_SYNTAX)
      snprintf(reason, size,
               "'%.40s' is not understood; write an energy such as '0 eV', 'midgap', "
               "'homo + 1.2 eV' or 'lumo - 0.3 eV'",
               text);
  }
  if (status != MHO_OK) return status;
  if (!(read.offset_ev >= -FERMI_LIMIT_EV && read.offset_ev <= FERMI_LIMIT_EV)) {
    snprintf(reason, size, "'%.40s' is out of range; allowed are %g eV to %g eV", text,
             -FERMI_LIMIT_EV, FERMI_LIMIT_EV);
    return MHO_ERR_RANGE;
  }
  *fermi = read;
  return MHO_OK;
}

const char *mho_fermi_write(const mho_fermi *fermi, char *buffer, size_t size)
{
  static const char *const word[] = {
      [MHO_FERMI_ENERGY] = "", [MHO_FERMI_MIDGAP] = "midgap",
      [MHO_FERMI_HOMO] = "homo", [MHO_FERMI_LUMO] = "lumo"};
  char number[40];
  double offset = fermi->offset_ev, size_ev = offset < 0 ? -offset : offset;
  if (fermi->kind == MHO_FERMI_ENERGY) {
    mho_number_write(number, sizeof number, 6, offset);
    snprintf(buffer, size, "%s eV", number);
  } else if (offset == 0.0) {
    snprintf(buffer, size, "%s", word[fermi->kind]);
  } else {
    mho_number_write(number, sizeof number, 6, size_ev);
    snprintf(buffer, size, "%s %c %s eV", word[fermi->kind], offset < 0 ? '-' : '+', number);
  }
  return buffer;
}

static mho_status apply_twist(const mho_twist *twist, mho_molecule *molecule,
                              mho_error *error)
{
  int a = mho_molecule_find_site(molecule, twist->site[0]);
  int b = mho_molecule_find_site(molecule, twist->site[1]);
  for (int k = 0; k < molecule->bond_count; k++) {
    mho_bond *bond = &molecule->bond[k];
    bool found = (bond->site[0] == a && bond->site[1] == b) ||
                 (bond->site[0] == b && bond->site[1] == a);
    if (!found) continue;
    bond->twist_deg = twist->angle_deg;
    bond->rotatable = true;
    return MHO_OK;
  }
  return mho_fail_at(error, MHO_ERR_REFERENCE, "input",
                     molecule->source ? molecule->source : "", 0, 0, "twist",
                     "twist: '%s' has no bond %s-%s between sites of the pi system",
                     molecule->name ? molecule->name : "", twist->site[0], twist->site[1]);
}

mho_status mho_settings_apply(const mho_settings *settings, mho_molecule *molecule,
                              mho_error *error)
{
  if (!settings) return MHO_OK;
  if (settings->has_beta) molecule->beta_ev = settings->beta_ev;
  if (settings->has_temperature) molecule->temperature_k = settings->temperature_k;
  if (settings->has_fermi) molecule->fermi = settings->fermi;
  for (int side = 0; settings->has_coupling && side < 2; side++) {
    molecule->contact[side].coupling_ev = settings->coupling_ev;
    molecule->contact[side].has_chain = false;
  }
  for (int i = 0; i < settings->twist_count; i++) {
    mho_status status = apply_twist(&settings->twist[i], molecule, error);
    if (status != MHO_OK) return status;
  }
  return MHO_OK;
}
