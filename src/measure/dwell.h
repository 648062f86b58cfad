/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Dwells of an idealised signal.
 */
#ifndef MHOLECULE_MEASURE_DWELL_H
#define MHOLECULE_MEASURE_DWELL_H

#include <mho/telegraph.h>

/* Adds the dwells of one trace to telegraph->dwell: path[n] with a resolution
 * of `least` samples imposed (a shorter dwell belongs to the one before it).
 * Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_dwells_add(mho_telegraph *telegraph, uint64_t trace,
                                       const uint8_t *path, const double *signal, size_t n,
                                       size_t least);

/* Levels, steps and mean dwells, with intervals, from telegraph->dwell. */
MHO_MUST_USE mho_status mho_dwells_summarise(mho_telegraph *telegraph);

#endif
