/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <mho/quantity.h>
#include <mho/settings.h>

#include <stdio.h>
#include <string.h>

#include "base/text.h"

enum { BETA, TEMPERATURE, COUPLING, FERMI, PARAMETERS, SETTING_COUNT };

static const char *const names[SETTING_COUNT] = {
    [BETA] = "beta", [TEMPERATURE] = "temperature", [COUPLING] = "coupling",
    [FERMI] = "fermi", [PARAMETERS] = "parameters"};

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

static mho_status read_parameters(const char *text, const mho_parameter_set **set,
                                  char *reason, size_t size)
{
  *set = mho_parameters_builtin(text);
  if (*set) return MHO_OK;
  size_t count;
  const char *const *known = mho_parameters_names(&count);
  char list[160];
  snprintf(reason, size, "parameter set '%.40s' is not known; allowed: %s", text,
           mho_join_words(known, count, list, sizeof list));
  return MHO_ERR_REFERENCE;
}

mho_status mho_settings_read(mho_settings *s, const char *name, const char *text,
                             char *reason, size_t size)
{
  mho_status status;
  if (!strcmp(name, names[BETA])) {
    status = read_quantity(BETA, text, &s->beta_ev, reason, size);
    s->has_beta |= status == MHO_OK;
  } else if (!strcmp(name, names[TEMPERATURE])) {
    status = read_quantity(TEMPERATURE, text, &s->temperature_k, reason, size);
    s->has_temperature |= status == MHO_OK;
  } else if (!strcmp(name, names[COUPLING])) {
    status = read_quantity(COUPLING, text, &s->coupling_ev, reason, size);
    s->has_coupling |= status == MHO_OK;
  } else if (!strcmp(name, names[FERMI])) {
    status = mho_fermi_read(text, &s->fermi, reason, size);
    s->has_fermi |= status == MHO_OK;
  } else if (!strcmp(name, names[PARAMETERS])) {
    status = read_parameters(text, &s->parameters, reason, size);
  } else {
    snprintf(reason, size, "'%.40s' is not a setting", name);
    status = MHO_ERR_KEY;
  }
  return status;
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

void mho_settings_apply(const mho_settings *settings, mho_molecule *molecule)
{
  if (!settings) return;
  if (settings->has_beta) molecule->beta_ev = settings->beta_ev;
  if (settings->has_temperature) molecule->temperature_k = settings->temperature_k;
  if (settings->parameters) molecule->parameters = settings->parameters;
  if (settings->has_fermi) molecule->fermi = settings->fermi;
  for (int side = 0; settings->has_coupling && side < 2; side++)
    molecule->contact[side].coupling_ev = settings->coupling_ev;
}
