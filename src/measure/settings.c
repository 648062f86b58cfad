/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "measure/settings.h"

#include <mho/quantity.h>

#include <stdio.h>
#include <string.h>

#define COUNT(array) (sizeof(array) / sizeof *(array))

const char *const *mho_trace_setting_names(size_t *count)
{
  static const char *const names[] = {"bias",     "series-resistance", "floor",
                                      "saturation", "sampling",        "speed"};
  *count = COUNT(names);
  return names;
}

static bool is_current(const char *text)
{
  double ampere;
  return mho_quantity_read(text, MHO_CURRENT, &ampere, NULL, 0) == MHO_OK;
}

mho_status mho_trace_setting_read(mho_trace_options *o, const char *name, const char *text,
                                  char *reason, size_t reason_size)
{
  bool current = is_current(text);
  const struct {
    const char *name;
    mho_dimension dimension;
    double low, high, *value;
    bool applies;
  } row[] = {{"bias", MHO_VOLTAGE, -10, 10, &o->bias_v, true},
             {"series-resistance", MHO_RESISTANCE, 0, 1e12, &o->series_ohm, true},
             {"floor", MHO_CURRENT, 1e-18, 1, &o->floor_a, current},
             {"floor", MHO_CONDUCTANCE, 1e-15, 1e3, &o->floor_g0, true},
             {"saturation", MHO_CURRENT, 1e-18, 1, &o->saturation_a, current},
             {"saturation", MHO_CONDUCTANCE, 1e-15, 1e3, &o->saturation_g0, true},
             {"sampling", MHO_FREQUENCY, 1e-3, 1e10, &o->sampling_hz, true},
             {"speed", MHO_SPEED, 1e-6, 1e9, &o->speed_nm_per_s, true}};
  for (size_t i = 0; i < COUNT(row); i++) {
    if (strcmp(row[i].name, name) || !row[i].applies) continue;
    double value;
    mho_status status = mho_quantity_read(text, row[i].dimension, &value, reason, reason_size);
    if (status != MHO_OK) return status;
    if (!(value >= row[i].low && value <= row[i].high)) {
      const char *unit = mho_dimension_base_unit(row[i].dimension);
      snprintf(reason, reason_size, "'%.40s' is out of range; allowed are %g %s to %g %s", text,
               row[i].low, unit, row[i].high, unit);
      return MHO_ERR_RANGE;
    }
    *row[i].value = value;
    return MHO_OK;
  }
  return MHO_ERR_KEY;
}
