/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "measure/logbin.h"

#include <math.h>
#include <stdlib.h>

enum { BIN_LIMIT = 20000, SIGNIFICAND_BITS = 52 };

static int64_t bits_of(double value)
{
  int64_t bits;
  memcpy(&bits, &value, sizeof bits);
  return bits;
}

static double value_of(int64_t bits)
{
  double value;
  memcpy(&value, &bits, sizeof value);
  return value;
}

static int slot_by_search(const mho_logbin *logbin, double value)
{
  int slot = 0;
  while (slot <= logbin->bins && value >= logbin->upper[slot]) slot++;
  return slot;
}

static mho_status build_table(mho_logbin *logbin, int per_decade)
{
  /* Cells of 2^-b must be narrower than a bin, of 10^(1/per_decade) - 1. */
  int b = 1;
  while (ldexp(1.0, -b) >= pow(10.0, 1.0 / per_decade) - 1.0) b++;
  logbin->shift = SIGNIFICAND_BITS - b;
  /* One cell below the first edge, one above the last catch the rest. */
  logbin->first = (bits_of(logbin->edge[0]) >> logbin->shift) - 1;
  logbin->last = (bits_of(logbin->edge[logbin->bins]) >> logbin->shift) + 1;
  size_t cells = (size_t)(logbin->last - logbin->first + 1);
  logbin->table = malloc(cells * sizeof *logbin->table);
  if (!logbin->table) return MHO_ERR_MEMORY;
  int slot = 0;
  for (size_t i = 0; i < cells; i++) {
    double start = value_of((logbin->first + (int64_t)i) << logbin->shift);
    slot = i == 0 ? slot_by_search(logbin, start) : slot;
    while (slot <= logbin->bins && start >= logbin->upper[slot]) slot++;
    logbin->table[i] = (uint16_t)slot;
  }
  logbin->table[0] = 0;
  return MHO_OK;
}

mho_status mho_logbin_init(mho_logbin *logbin, double low, double high,
                           int per_decade, mho_error *error)
{
  *logbin = (mho_logbin){0};
  double bins = rint((high - low) * per_decade);
  if (!(low >= -30.0 && high <= 30.0 && low < high) || per_decade < 1 ||
      per_decade > 1000 || bins < 1 || bins > BIN_LIMIT)
    return mho_fail(error, MHO_ERR_RANGE, "measure", "bins",
                    "histogram from 10^%g to 10^%g with %d bins a decade; within "
                    "10^-30 to 10^30, 1 to 1000 a decade and %d in all are allowed",
                    low, high, per_decade, BIN_LIMIT);
  logbin->bins = (int)bins;
  logbin->edge = malloc(((size_t)bins + 1) * sizeof(double));
  logbin->upper = malloc(((size_t)bins + 2) * sizeof(double));
  mho_status status = logbin->edge && logbin->upper ? MHO_OK : MHO_ERR_MEMORY;
  if (status == MHO_OK) {
    for (int i = 0; i <= logbin->bins; i++) {
      logbin->edge[i] = (double)powl(10.0L, (long double)low + (long double)i / per_decade);
      logbin->upper[i] = logbin->edge[i];
    }
    logbin->upper[logbin->bins + 1] = NAN; /* never reached */
    status = build_table(logbin, per_decade);
  }
  if (status != MHO_OK) {
    mho_logbin_clear(logbin);
    return mho_fail(error, status, "measure", NULL, "out of memory");
  }
  return MHO_OK;
}

void mho_logbin_clear(mho_logbin *logbin)
{
  free(logbin->edge);
  free(logbin->upper);
  free(logbin->table);
  *logbin = (mho_logbin){0};
}
