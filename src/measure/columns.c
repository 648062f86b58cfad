/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A name is quantity and unit: `current_nA`, `Current (nA)`, `log10_G0`.
 */
#include "measure/columns.h"

#include <mho/quantity.h>

#include <ctype.h>
#include <stdio.h>
#include <string.h>
#include <strings.h>

enum { NAME_SIZE = 64 };

#define ALLOWED                                                           \
  "distance_nm, time_s, conductance_G0, conductance_S, log10_G0, "        \
  "current_A and trace are (with other units too: current_nA)"

static const struct {
  const char *name;
  mho_dimension dimension;
  mho_abscissa abscissa; /* or, where there is none, a value */
} known[] = {
    {"distance", MHO_LENGTH, MHO_ABSCISSA_DISTANCE},
    {"displacement", MHO_LENGTH, MHO_ABSCISSA_DISTANCE},
    {"time", MHO_TIME, MHO_ABSCISSA_TIME},
    {"conductance", MHO_CONDUCTANCE, MHO_ABSCISSA_NONE},
    {"current", MHO_CURRENT, MHO_ABSCISSA_NONE},
    {"log10", MHO_DECADES, MHO_ABSCISSA_NONE},
};

char mho_columns_separator(const char *text, size_t size)
{
  static const char separators[] = {';', ',', '\t'};
  for (size_t i = 0; i < sizeof separators; i++)
    if (memchr(text, separators[i], size)) return separators[i];
  return ' ';
}

/* Cuts `Current (nA)` or `current_nA` into a name and a unit. */
static void split_name(char *name, char **unit)
{
  char *cut = strpbrk(name, "([");
  if (!cut) cut = strrchr(name, '_');
  if (!cut) cut = name + strlen(name);
  *unit = *cut ? cut + 1 : cut;
  *cut = '\0';
  (*unit)[strcspn(*unit, ")]")] = '\0';
  for (size_t n = strlen(name); n > 0 && isspace((unsigned char)name[n - 1]); n--)
    name[n - 1] = '\0';
}

/* Factor from the unit to the one that the reader works in; S keeps its own,
 * since G0 is the base unit of a conductance. */
static bool unit_scale(mho_dimension dimension, const char *unit, double *scale)
{
  char quantity[NAME_SIZE + 8];
  if (dimension == MHO_DECADES) {
    *scale = 1.0;
    return strcmp(unit, "G0") == 0;
  }
  snprintf(quantity, sizeof quantity, "1 %s", unit);
  return mho_quantity_read(quantity, dimension, scale, NULL, 0) == MHO_OK;
}

static mho_trace_quantity quantity_of(mho_dimension dimension)
{
  return dimension == MHO_CURRENT   ? MHO_TRACE_AMPERE
         : dimension == MHO_DECADES ? MHO_TRACE_LOG10_G0
                                    : MHO_TRACE_G0;
}

static mho_status take_name(mho_columns *columns, int index, char *name,
                            mho_abscissa wanted, const char *path, long line,
                            long column, mho_error *error)
{
  if (!strcasecmp(name, "trace") || !strcasecmp(name, "trace_number")) {
    columns->number = index;
    return MHO_OK;
  }
  char *unit;
  split_name(name, &unit);
  for (size_t i = 0; i < sizeof known / sizeof *known; i++) {
    if (strcasecmp(name, known[i].name) != 0) continue;
    double scale;
    if (!unit_scale(known[i].dimension, unit, &scale))
      return mho_fail_at(error, MHO_ERR_UNIT, "measure", path, line, column, name,
                         "column '%s' has the unit '%s'; %s is needed", name, unit,
                         known[i].dimension == MHO_DECADES
                             ? "G0" : mho_dimension_units(known[i].dimension));
    if (known[i].abscissa == MHO_ABSCISSA_NONE) {
      if (columns->value >= 0)
        return mho_fail_at(error, MHO_ERR_KEY, "measure", path, line, column, name,
                           "a second column of conductance or current; one is read");
      columns->value = index;
      columns->quantity = quantity_of(known[i].dimension);
      columns->value_scale = scale;
    } else if (columns->x < 0 || known[i].abscissa == wanted) {
      columns->x = index;
      columns->abscissa = known[i].abscissa;
      columns->x_scale = scale;
    }
    return MHO_OK;
  }
  return MHO_OK; /* a column of something else */
}

static void empty_columns(mho_columns *columns)
{
  *columns = (mho_columns){.value = -1, .x = -1, .number = -1,
                           .value_scale = 1.0, .x_scale = 1.0};
}

mho_status mho_columns_named(mho_columns *columns, const char *text, size_t size,
                             char separator, mho_abscissa wanted,
                             const char *path, long line, mho_error *error)
{
  empty_columns(columns);
  size_t at = 0;
  while (at <= size) {
    while (at < size && (text[at] == ' ' || (text[at] == '\t' && separator != '\t'))) at++;
    if (at >= size && separator == ' ') break;
    size_t stop = at;
    while (stop < size && text[stop] != separator &&
           !(separator == ' ' && text[stop] == '\t'))
      stop++;
    if (columns->count == MHO_TRACE_COLUMN_LIMIT)
      return mho_fail_at(error, MHO_ERR_LIMIT, "measure", path, line, (long)at + 1, NULL,
                         "more than %d columns; a line is one point of one trace",
                         MHO_TRACE_COLUMN_LIMIT);
    size_t end = stop;
    while (end > at && isspace((unsigned char)text[end - 1])) end--;
    char name[NAME_SIZE];
    size_t length = end - at < NAME_SIZE - 1 ? end - at : NAME_SIZE - 1;
    memcpy(name, text + at, length);
    name[length] = '\0';
    mho_status status = take_name(columns, columns->count, name, wanted, path,
                                  line, (long)at + 1, error);
    if (status != MHO_OK) return status;
    columns->count++;
    at = stop + 1;
  }
  if (columns->value < 0)
    return mho_fail_at(error, MHO_ERR_KEY, "measure", path, line, 1, NULL,
                       "no column of conductance or current is named; " ALLOWED
                       " understood");
  return MHO_OK;
}

mho_status mho_columns_guess(mho_columns *columns, int count,
                             const mho_trace_options *options, const char *path,
                             long line, mho_error *error)
{
  empty_columns(columns);
  if (count > 2)
    return mho_fail_at(error, MHO_ERR_KEY, "measure", path, line, 1, NULL,
                       "%d columns without a header; name them in the first "
                       "line or with --columns: " ALLOWED " understood", count);
  columns->count = count;
  columns->value = count - 1;
  columns->quantity = options->quantity;
  if (columns->quantity == MHO_TRACE_AUTO)
    columns->quantity = options->bias_v != 0.0 ? MHO_TRACE_AMPERE : MHO_TRACE_G0;
  if (columns->quantity == MHO_TRACE_SIEMENS) {
    columns->quantity = MHO_TRACE_G0;
    if (!unit_scale(MHO_CONDUCTANCE, "S", &columns->value_scale))
      return mho_fail(error, MHO_ERR_UNIT, "measure", NULL, "S is not a unit");
  }
  if (count == 2) {
    columns->x = 0;
    columns->abscissa = options->first_column;
  }
  return MHO_OK;
}
