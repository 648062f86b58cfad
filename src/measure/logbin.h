/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Logarithmic bins without a logarithm, exact at every edge.
 *
 * The exponent and the first bits of the significand of a double name a cell
 * narrower than a bin, so a cell touches at most two bins; a table gives the
 * lower of them and one comparison with the edge between them decides.
 *
 * Where the processor has wide vectors, a polynomial for the logarithm tells
 * the slots of many numbers at once, and which of them lie so near an edge
 * that the table has to decide: the slots are the same on every processor.
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
  /* The polynomial: numbers are held between `least` and `most`, which lie in
   * the outer slots; slot = slope log2(value) + offset to within `doubt`. */
  double least, most, slope, offset, doubt;
  int lanes; /* doubles a vector, 1 to use the table alone */
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

/* slot[n] of many numbers; 0 for NaN and what is below `floor` too. */
void mho_logbin_slots(const mho_logbin *logbin, double floor, const double *value,
                      size_t n, int32_t *slot);

#endif
