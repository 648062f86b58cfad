/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Quantities with units: one table of units, one of dimensions.
 */
#include <mho/constants.h>
#include <mho/quantity.h>

#include <math.h>
#include <stdio.h>
#include <string.h>
#include <strings.h>

#define DEGREES_PER_RADIAN 57.295779513082320876798154814105
#define KJ_PER_KCAL 4.184 /* thermochemical calorie, exact by definition */
#define G0_PER_SIEMENS (1.0 / MHO_CONDUCTANCE_QUANTUM_S)

/* A value in the unit is (value * scale) in the base unit.  Powers of ten
 * below one are divisors, so that 300 meV is the double nearest to 0.3 eV. */
typedef struct {
  mho_dimension dimension;
  const char *symbol;
  double scale, divisor;
} unit;

static const unit units[] = {
    {MHO_ENERGY, "eV", 1, 1},
    {MHO_ENERGY, "meV", 1, 1e3},
    {MHO_ANGLE, "deg", 1, 1},
    {MHO_ANGLE, "°", 1, 1},
    {MHO_ANGLE, "rad", DEGREES_PER_RADIAN, 1},
    {MHO_LENGTH, "nm", 1, 1},
    {MHO_LENGTH, "Å", 1, 10},
    {MHO_LENGTH, "angstrom", 1, 10},
    {MHO_LENGTH, "pm", 1, 1e3},
    {MHO_TEMPERATURE, "K", 1, 1},
    {MHO_TEMPERATURE, "mK", 1, 1e3},
    {MHO_VOLTAGE, "V", 1, 1},
    {MHO_VOLTAGE, "mV", 1, 1e3},
    {MHO_CURRENT, "A", 1, 1},
    {MHO_CURRENT, "mA", 1, 1e3},
    {MHO_CURRENT, "uA", 1, 1e6},
    {MHO_CURRENT, "µA", 1, 1e6},
    {MHO_CURRENT, "nA", 1, 1e9},
    {MHO_CURRENT, "pA", 1, 1e12},
    {MHO_CONDUCTANCE, "G0", 1, 1},
    {MHO_CONDUCTANCE, "S", G0_PER_SIEMENS, 1},
    {MHO_CONDUCTANCE, "mS", G0_PER_SIEMENS, 1e3},
    {MHO_CONDUCTANCE, "uS", G0_PER_SIEMENS, 1e6},
    {MHO_CONDUCTANCE, "µS", G0_PER_SIEMENS, 1e6},
    {MHO_CONDUCTANCE, "nS", G0_PER_SIEMENS, 1e9},
    {MHO_CONDUCTANCE, "pS", G0_PER_SIEMENS, 1e12},
    {MHO_SEEBECK, "uV/K", 1, 1},
    {MHO_SEEBECK, "µV/K", 1, 1},
    {MHO_SEEBECK, "mV/K", 1e3, 1},
    {MHO_DECADES, "decades", 1, 1},
    {MHO_DECADES, "decade", 1, 1},
    {MHO_MOLAR_ENERGY, "kJ/mol", 1, 1},
    {MHO_MOLAR_ENERGY, "kcal/mol", KJ_PER_KCAL, 1},
    {MHO_TIME, "s", 1, 1},
    {MHO_TIME, "ms", 1, 1e3},
    {MHO_TIME, "us", 1, 1e6},
    {MHO_TIME, "µs", 1, 1e6},
    {MHO_RESISTANCE, "ohm", 1, 1},
    {MHO_RESISTANCE, "kohm", 1e3, 1},
    {MHO_RESISTANCE, "Mohm", 1e6, 1},
    {MHO_FREQUENCY, "Hz", 1, 1},
    {MHO_FREQUENCY, "kHz", 1e3, 1},
    {MHO_FREQUENCY, "MHz", 1e6, 1},
    {MHO_SPEED, "nm/s", 1, 1},
    {MHO_SPEED, "um/s", 1e3, 1},
    {MHO_SPEED, "µm/s", 1e3, 1},
};

enum { UNIT_COUNT = sizeof units / sizeof *units };

static const struct {
  const char *name, *article, *units, *base;
} dimensions[MHO_DIMENSIONS] = {
    [MHO_ENERGY] = {"energy", "an", "eV or meV", "eV"},
    [MHO_ANGLE] = {"angle", "an", "deg or rad", "deg"},
    [MHO_LENGTH] = {"length", "a", "nm, angstrom or pm", "nm"},
    [MHO_TEMPERATURE] = {"temperature", "a", "K or mK", "K"},
    [MHO_VOLTAGE] = {"voltage", "a", "V or mV", "V"},
    [MHO_CURRENT] = {"current", "a", "A, mA, uA, nA or pA", "A"},
    [MHO_CONDUCTANCE] = {"conductance", "a", "G0, S, mS, uS, nS or pS", "G0"},
    [MHO_SEEBECK] = {"Seebeck coefficient", "a", "uV/K or mV/K", "uV/K"},
    [MHO_DECADES] = {"spread", "a", "decades", "decades"},
    [MHO_MOLAR_ENERGY] = {"molar energy", "a", "kJ/mol or kcal/mol", "kJ/mol"},
    [MHO_TIME] = {"time", "a", "s, ms or us", "s"},
    [MHO_RESISTANCE] = {"resistance", "a", "ohm, kohm or Mohm", "ohm"},
    [MHO_FREQUENCY] = {"frequency", "a", "Hz, kHz or MHz", "Hz"},
    [MHO_SPEED] = {"speed", "a", "nm/s or um/s", "nm/s"},
};

const char *mho_dimension_name(mho_dimension dimension)
{
  return dimensions[dimension].name;
}

const char *mho_dimension_units(mho_dimension dimension)
{
  return dimensions[dimension].units;
}

const char *mho_dimension_base_unit(mho_dimension dimension)
{
  return dimensions[dimension].base;
}

static bool is_blank(char c) { return c == ' ' || c == '\t'; }

/* Case counts: mS and MS differ by nine decades.  A wrong case is named. */
static const unit *find_unit(const char *symbol, bool exact)
{
  for (int i = 0; i < UNIT_COUNT; i++) {
    int differs = exact ? strcmp(units[i].symbol, symbol)
                        : strcasecmp(units[i].symbol, symbol);
    if (!differs) return &units[i];
  }
  return NULL;
}

static mho_status refuse_unit(const char *text, const char *symbol,
                              mho_dimension dimension, char *reason,
                              size_t reason_size)
{
  const unit *other = find_unit(symbol, true);
  const unit *cased = find_unit(symbol, false);
  if (other)
    snprintf(reason, reason_size, "'%.40s' is %s %s, but %s %s is needed; write it in %s",
             text, dimensions[other->dimension].article,
             dimensions[other->dimension].name, dimensions[dimension].article,
             dimensions[dimension].name, dimensions[dimension].units);
  else if (cased && cased->dimension == dimension)
    snprintf(reason, reason_size,
             "unit '%.20s' is not known; did you mean '%s'? write %s %s in %s",
             symbol, cased->symbol, dimensions[dimension].article,
             dimensions[dimension].name, dimensions[dimension].units);
  else
    snprintf(reason, reason_size,
             "unit '%.20s' is not known; write %s %s in %s", symbol,
             dimensions[dimension].article, dimensions[dimension].name,
             dimensions[dimension].units);
  return MHO_ERR_UNIT;
}

mho_status mho_quantity_read(const char *text, mho_dimension dimension,
                             double *value, char *reason, size_t reason_size)
{
  char unused[1];
  if (!reason) {
    reason = unused;
    reason_size = sizeof unused;
  }
  const char *s = text;
  while (is_blank(*s)) s++;
  double number;
  const char *end;
  if (!mho_number_read(s, &end, &number)) {
    snprintf(reason, reason_size,
             "'%.40s' is not a number with a unit; write %s %s in %s, "
             "such as '0.3 %s'",
             text, dimensions[dimension].article, dimensions[dimension].name,
             dimensions[dimension].units, dimensions[dimension].base);
    return MHO_ERR_SYNTAX;
  }
  const char *number_text_end = end;
  while (is_blank(*end)) end++;
  char symbol[32];
  size_t length = strlen(end);
  while (length > 0 && is_blank(end[length - 1])) length--;
  if (length == 0) {
    snprintf(reason, reason_size, "'%.40s' has no unit; write '%.*s %s' (%s)",
             s, (int)(number_text_end - s > 30 ? 30 : number_text_end - s), s,
             dimensions[dimension].base, dimensions[dimension].units);
    return MHO_ERR_UNIT;
  }
  snprintf(symbol, sizeof symbol, "%.*s", (int)(length < 31 ? length : 31), end);
  const unit *found = length < sizeof symbol ? find_unit(symbol, true) : NULL;
  if (!found || found->dimension != dimension)
    return refuse_unit(text, symbol, dimension, reason, reason_size);
  double result = number * found->scale / found->divisor;
  if (!isfinite(result)) {
    snprintf(reason, reason_size, "'%.40s' is too large", text);
    return MHO_ERR_RANGE;
  }
  *value = result;
  return MHO_OK;
}
