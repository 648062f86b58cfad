/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef MHOLECULE_MOLECULE_RING_SYSTEM_H
#define MHOLECULE_MOLECULE_RING_SYSTEM_H

#include "molecule/rings.h"

/* Places the rings listed in ring[count], which form one fused system.  done
 * [rings] and placed [points] are false for them at the start.  False where
 * polygons do not close; the positions are then of no use. */
bool mho_ring_system_build(const mho_ring_list *rings, const int *ring, int count,
                           bool *done, bool *placed, double (*position)[2]);

#endif
