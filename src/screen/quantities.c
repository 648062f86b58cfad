/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <mho/conductance.h>
#include <mho/screen.h>

#include <stddef.h>
#include <stdio.h>
#include <string.h>

#define IS_WHOLE_int true
#define IS_WHOLE_double false

static const mho_screen_quantity table[] = {
#define ROW(member, type, column, name, form, what) \
  {column, name, what, MHO_FORM_##form, IS_WHOLE_##type},
    MHO_SCREEN_QUANTITY_LIST(ROW)
#undef ROW
};

static const size_t place[] = {
#define PLACE(member, type, column, name, form, what) offsetof(mho_screen_quantities, member),
    MHO_SCREEN_QUANTITY_LIST(PLACE)
#undef PLACE
};

static bool exists(int index) { return index >= 0 && index < MHO_SCREEN_QUANTITIES; }

const mho_screen_quantity *mho_screen_quantity_at(int index)
{
  return exists(index) ? &table[index] : NULL;
}

bool mho_screen_value(const mho_screen_quantities *quantities, int index, double *value)
{
  *value = 0;
  if (!exists(index) || !(quantities->has >> index & 1)) return false;
  const char *at = (const char *)quantities + place[index];
  int whole;
  if (table[index].whole) {
    memcpy(&whole, at, sizeof whole);
    *value = whole;
  } else {
    memcpy(value, at, sizeof *value);
  }
  return true;
}

bool mho_screen_set_value(mho_screen_quantities *quantities, int index, double value)
{
  if (!exists(index)) return false;
  char *at = (char *)quantities + place[index];
  int whole = table[index].whole ? (int)value : 0;
  if (table[index].whole) memcpy(at, &whole, sizeof whole);
  else memcpy(at, &value, sizeof value);
  quantities->has |= UINT32_C(1) << index;
  return true;
}

const char *mho_screen_shared_name(int index, char *buffer, size_t size)
{
  if (index == MHO_SHARED_FERMI) snprintf(buffer, size, "fermi_eV");
  else if (index == MHO_SHARED_BETA) snprintf(buffer, size, "beta_eV");
  else if (index < MHO_SHARED_H)
    snprintf(buffer, size, "ln coupling %s",
             mho_linker_name((mho_linker_kind)(index - MHO_SHARED_COUPLING)));
  else if (index < MHO_SHARED_K) snprintf(buffer, size, "h of row %d", index - MHO_SHARED_H);
  else snprintf(buffer, size, "k of row %d", index - MHO_SHARED_K);
  return buffer;
}

mho_screen_settings mho_screen_defaults(void)
{
  return (mho_screen_settings){.window_ev = mho_conductance_defaults().window_ev,
                               .sensitivity = mho_sensitivity_defaults()};
}
