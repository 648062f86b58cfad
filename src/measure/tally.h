/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Counts by slot.  Neighbouring points often meet in a slot, and a sum that
 * waits for the sum before it is slow: every fourth point counts in a part of
 * its own, in 16 bits that stay in the first cache.
 */
#ifndef MHOLECULE_MEASURE_TALLY_H
#define MHOLECULE_MEASURE_TALLY_H

#include <stdint.h>

#include <mho/status.h>

typedef struct {
  size_t slots;
  uint64_t *sum;  /* [slots], complete after mho_tally_join */
  uint16_t *part; /* [4 * slots] */
  size_t waiting; /* points in the parts */
} mho_tally;

/* False without memory. */
MHO_MUST_USE bool mho_tally_init(mho_tally *tally, size_t slots);
void mho_tally_clear(mho_tally *tally);

void mho_tally_reset(mho_tally *tally);
void mho_tally_add(mho_tally *tally, const int32_t *slot, size_t n);
void mho_tally_join(mho_tally *tally);

#endif
