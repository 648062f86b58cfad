/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Logarithmic bins without a logarithm, exact at every edge.
 *
 * The exponent and the first bits of the significand of a double name a cell
 * narrower than a bin, so a cell touches at most two bins; a table gives the
 * lower of them and one comparison with the edge between them decides.
 */
#ifndef MHOLECULE_MEASURE_LOGBIN_H
#define MHOLECULE_MEASURE_LOGBIN_H

#include <stdint.h>
#include <string.h>

#include <mho/status.h>

typedef struct {
  int bins;
  double *edge;     /* [bins + 1]: 10^(low + i/per_decade), nearest doubles */
  double *upper;    /* [bins + 2]: upper edges with underflow in front */
  uint16_t *table;  /* a cell's slot */
  int64_t first, last; /* cells of the table */
  int shift;
} mho_logbin;

/* Bins from 10^low up to 10^high.
 * Errors: MHO_ERR_RANGE, MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_logbin_init(mho_logbin *logbin, double low, double high,
                                        int per_decade, mho_error *error);
void mho_logbin_clear(mho_logbin *logbin);

/* Slot of a number that is not NaN: 0 below the first edge (and for zero and
 * negative numbers), bins + 1 from the last edge on, else the bin from 1. */
static inline int mho_logbin_slot(const mho_logbin *logbin, double value)
{
  int64_t bits;
  memcpy(&bits, &value, sizeof bits);
  int64_t cell = bits >> logbin->shift;
  if (cell < logbin->first) cell = logbin->first;
  if (cell > logbin->last) cell = logbin->last;
  int slot = logbin->table[cell - logbin->first];
  return slot + (value >= logbin->upper[slot]);
}

#endif
