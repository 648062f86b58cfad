/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "measure/logbin.h"

#include "base/processor.h"

#include <math.h>
#include <stdlib.h>

#if defined(__x86_64__) && defined(__GNUC__) && !defined(__clang__)
#define HAS_WIDE_VECTORS 1
#endif

enum { BIN_LIMIT = 20000, SIGNIFICAND_BITS = 52 };

enum { BLOCK = 64 }; /* numbers that one doubtful among them sends to the table */

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

/* Doubles a vector of this processor. */
static int vector_lanes(void)
{
#ifdef HAS_WIDE_VECTORS
  if (__builtin_cpu_supports("x86-64-v4")) return 8;
  if (__builtin_cpu_supports("x86-64-v3")) return 4;
#endif
  return 1;
}

#define LOG2_ERROR 4e-7 /* of the polynomial; 3.7e-7 measured */

static void set_polynomial(mho_logbin *logbin, double low, int per_decade)
{
  double half = pow(10.0, 0.5 / per_decade);
  logbin->least = logbin->edge[0] / half;
  logbin->most = logbin->edge[logbin->bins] * half;
  logbin->slope = per_decade * 0.30102999566398119521; /* log10(2) */
  logbin->offset = 1.0 - low * per_decade;
  logbin->doubt = LOG2_ERROR * logbin->slope + 1e-9;
  logbin->lanes = vector_lanes();
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
    set_polynomial(logbin, low, per_decade);
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

static void slots_by_table(const mho_logbin *logbin, double floor, const double *value, size_t n,
                           int32_t *slot)
{
  for (size_t i = 0; i < n; i++)
    slot[i] = value[i] >= floor ? mho_logbin_slot(logbin, value[i]) : 0;
}

#ifdef HAS_WIDE_VECTORS
#define FMA __builtin_fma /* these processors have it */

/* BLOCK slots, true where all are sure.  value = 2^e (1.5 + x); log2(1.5 + x)
 * is interpolated at the eight Chebyshev points.  Adding 1.5 * 2^52 rounds to
 * a whole number and leaves it in the low bits. */
INLINED bool slots_by_polynomial(const mho_logbin *logbin, double floor, const double *value,
                                 int32_t *slot)
{
  const double least = logbin->least, most = logbin->most, slope = logbin->slope;
  const double offset = logbin->offset - 0.5, two52 = 0x1p52, whole = 0x1.8p52;
  double farthest = 0.0; /* from a whole number and a half */
#pragma omp simd reduction(max : farthest)
  for (int i = 0; i < BLOCK; i++) {
    double v = value[i] >= floor ? value[i] : least;
    v = v > least ? v : least;
    v = v < most ? v : most;
    int64_t bits = bits_of(v);
    double e = value_of((bits >> SIGNIFICAND_BITS) | bits_of(two52)) - (two52 + 1023);
    double x = value_of((bits & 0xfffffffffffff) | bits_of(1.0)) - 1.5, x2 = x * x;
    double low = FMA(FMA(0.14250802403318941, x, -0.320631878456766), x2,
                     FMA(0.96179654016652982, x, 0.58496275910444462));
    double high = FMA(FMA(0.014440352495941333, x, -0.025110140952567139), x2,
                      FMA(0.037610464280420086, x, -0.070594554022537004));
    double y = FMA(e + FMA(high, x2 * x2, low), slope, offset), rounded = y + whole;
    slot[i] = (int32_t)bits_of(rounded);
    double distance = fabs(y - (rounded - whole));
    farthest = distance > farthest ? distance : farthest;
  }
  return farthest < 0.5 - logbin->doubt;
}

#define SLOTS_FOR(name, processor)                                                            \
  __attribute__((target(processor))) static void name(const mho_logbin *logbin, double floor, \
                                                      const double *value, size_t n,          \
                                                      int32_t *slot)                          \
  {                                                                                           \
    for (size_t i = 0; i < n; i += BLOCK)                                                     \
      if (!slots_by_polynomial(logbin, floor, value + i, slot + i))                           \
        slots_by_table(logbin, floor, value + i, BLOCK, slot + i);                            \
  }

SLOTS_FOR(slots_of_four, "arch=x86-64-v3")
SLOTS_FOR(slots_of_eight, "arch=x86-64-v4,prefer-vector-width=512")
#endif

void mho_logbin_slots(const mho_logbin *logbin, double floor, const double *value, size_t n,
                      int32_t *slot)
{
  size_t whole = 0; /* points in whole blocks */
#ifdef HAS_WIDE_VECTORS
  if (logbin->lanes > 1) whole = n / BLOCK * BLOCK;
  if (logbin->lanes == 8) slots_of_eight(logbin, floor, value, whole, slot);
  if (logbin->lanes == 4) slots_of_four(logbin, floor, value, whole, slot);
#endif
  slots_by_table(logbin, floor, value + whole, n - whole, slot + whole);
}
