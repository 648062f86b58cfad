/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A stream of random numbers of its own for every (seed, index), so that
 * threads do not change results: SplitMix64 (G. L. Steele, D. Lea and
 * C. H. Flood, Proc. OOPSLA 2014).
 */
#ifndef MHOLECULE_MEASURE_RANDOM_H
#define MHOLECULE_MEASURE_RANDOM_H

#include <stdint.h>

typedef struct {
  uint64_t state;
} mho_random;

static inline uint64_t mho_random_bits(mho_random *random)
{
  uint64_t z = random->state += UINT64_C(0x9e3779b97f4a7c15);
  z = (z ^ (z >> 30)) * UINT64_C(0xbf58476d1ce4e5b9);
  z = (z ^ (z >> 27)) * UINT64_C(0x94d049bb133111eb);
  return z ^ (z >> 31);
}

static inline mho_random mho_random_stream(uint64_t seed, uint64_t index)
{
  mho_random random = {seed};
  random.state = mho_random_bits(&random) ^ index;
  random.state = mho_random_bits(&random);
  return random;
}

/* A whole number below n (n < 2^32; the bias is below n/2^64). */
static inline uint64_t mho_random_below(mho_random *random, uint64_t n)
{
  return (uint64_t)(((unsigned __int128)mho_random_bits(random) * n) >> 64);
}

#endif
