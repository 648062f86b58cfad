/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Derivatives by shared parameters as a store keeps them: 32-bit floats,
 * little-endian on every machine.
 */
#ifndef MHOLECULE_SCREEN_SHARED_H
#define MHOLECULE_SCREEN_SHARED_H

#include <string.h>

#include <mho/screen.h>

enum { MHO_SHARED_BYTES = 4 * MHO_SHARED_COUNT };

static inline void mho_shared_pack(const float *shared, unsigned char *bytes)
{
  for (int i = 0; i < MHO_SHARED_COUNT; i++) {
    uint32_t word;
    memcpy(&word, &shared[i], sizeof word);
    for (int b = 0; b < 4; b++) bytes[4 * i + b] = (unsigned char)(word >> 8 * b);
  }
}

static inline void mho_shared_unpack(const unsigned char *bytes, float *shared)
{
  for (int i = 0; i < MHO_SHARED_COUNT; i++) {
    uint32_t word = 0;
    for (int b = 0; b < 4; b++) word |= (uint32_t)bytes[4 * i + b] << 8 * b;
    memcpy(&shared[i], &word, sizeof word);
  }
}

#endif
