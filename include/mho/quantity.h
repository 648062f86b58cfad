/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Quantities with units, and numbers in text.  Nothing here depends on the
 * locale.
 */
#ifndef MHOLECULE_QUANTITY_H
#define MHOLECULE_QUANTITY_H

#include <mho/status.h>

/* Every value inside the library is in the base unit of its dimension. */
typedef enum {
  MHO_ENERGY,       /* eV */
  MHO_ANGLE,        /* degrees */
  MHO_LENGTH,       /* nm */
  MHO_TEMPERATURE,  /* K */
  MHO_VOLTAGE,      /* V */
  MHO_CURRENT,      /* A */
  MHO_CONDUCTANCE,  /* G0 = 2e^2/h */
  MHO_SEEBECK,      /* uV/K */
  MHO_DECADES,      /* powers of ten of a ratio */
  MHO_MOLAR_ENERGY, /* kJ/mol */
  MHO_TIME,         /* s */
  MHO_RESISTANCE,   /* ohm */
  MHO_FREQUENCY,    /* Hz */
  MHO_SPEED,        /* nm/s */
  MHO_DIMENSIONS
} mho_dimension;

MHO_BEGIN_DECLARATIONS

/* Reads one finite decimal number at the start of text and sets *end behind
 * it; false (and *end = text) where there is none or it overflows. */
MHO_API MHO_MUST_USE bool mho_number_read(const char *text, const char **end,
                                          double *value);

/* Writes value with `digits` significant digits (1..17), shortest form, with a
 * decimal point in every locale; returns the length as snprintf does. */
MHO_API int mho_number_write(char *buffer, size_t size, int digits,
                             double value);

/* Reads `0.3 eV`, `300meV`, `38 deg`, `93 nS` ... into the base unit.  On
 * failure `reason` (may be NULL) says what is wrong and what is allowed, and
 * the status is MHO_ERR_UNIT (unit missing, unknown or of another kind) or
 * MHO_ERR_SYNTAX (no number). */
MHO_API MHO_MUST_USE mho_status mho_quantity_read(const char *text,
                                                  mho_dimension dimension,
                                                  double *value, char *reason,
                                                  size_t reason_size);

/* `energy`, `angle` ...; its base unit; and the units that are understood. */
MHO_API const char *mho_dimension_name(mho_dimension dimension);
MHO_API const char *mho_dimension_base_unit(mho_dimension dimension);
MHO_API const char *mho_dimension_units(mho_dimension dimension);

MHO_END_DECLARATIONS

#endif
