/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Random junctions, the same in every run.
 */
#ifndef MHOLECULE_TESTS_RANDOM_JUNCTION_H
#define MHOLECULE_TESTS_RANDOM_JUNCTION_H

#include "junctions.h"

static inline double uniform(void)
{
  static unsigned long long state = 7;
  state = state * 6364136223846793005ULL + 1442695040888963407ULL;
  return (double)(state >> 11) * 0x1p-53;
}

/* A ladder of random bonds, up to four sites back: rings, branches, sites of several
 * kinds; couplings over ten decades. */
static inline raw random_junction(int sites, double gamma[2], double *zero, double *vectors)
{
  const double beta = -2.7;
  static const double onsite[] = {0, 0, 0, 0, 0.51, 1.37};
  size_t n = (size_t)sites;
  raw r = {.sites = sites, .h = calloc(n * n, sizeof(double))};
  for (size_t i = 0; i < n; i++) r.h[i * n + i] = beta * onsite[(size_t)(6 * uniform())];
  for (size_t i = 1; i < n; i++)
    for (int bond = 0; bond < 2; bond++) {
      size_t back = 1 + (size_t)(4 * uniform());
      if (back > i || (bond && uniform() < 0.6)) back = 1;
      r.h[i * n + i - back] = r.h[(i - back) * n + i] = beta * (uniform() < 0.5 ? 1 : 0.8 + 0.3 * uniform());
    }
  size_t left = (size_t)(uniform() * (double)n), right = (size_t)(uniform() * (double)n);
  memset(vectors, 0, 2 * n * sizeof(double));
  vectors[left] = vectors[n + right] = 1;
  for (int side = 0; side < 2; side++) {
    gamma[side] = pow(10, -9 + 10 * uniform());
    r.lead[side] = (mho_lead){1, &gamma[side], zero, vectors + (side ? n : 0), NULL};
  }
  return r;
}

#endif
