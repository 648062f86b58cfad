/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Ranks over the integers modulo a prime.  The doubles of H are m 2^e, so H
 * maps into that field exactly; a rank can only fall there, and does so where
 * the prime divides one certain determinant, which happens by chance in about
 * one of 1e13 matrices (bits of the determinant over bits of the prime, against
 * the number of primes of that size).
 *
 *   visible   dimension of the smallest space with v_l and v_r that H keeps,
 *   poles     length of the shortest recurrence of mu_j = v_r^T H^j v_l
 *             (J. L. Massey, IEEE Trans. Inf. Theory 15, 122 (1969)).
 */
#include "solver/exact.h"

#include <math.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

typedef uint64_t residue; /* x 2^64 mod PRIME: P. L. Montgomery, Math. Comp. 44, 519 (1985) */

#define PRIME 0x3fffffffffffffc7ULL /* 2^62 - 57 */

enum { MANTISSA = 53, NEWTON = 6 };

/* -1/PRIME mod 2^64. */
static uint64_t negative_inverse(void)
{
  uint64_t inverse = PRIME; /* right to 3 bits, doubled by each step */
  for (int k = 0; k < NEWTON; k++) inverse *= 2 - PRIME * inverse;
  return -inverse;
}

static residue reduce(unsigned __int128 x, uint64_t inverse)
{
  uint64_t m = (uint64_t)x * inverse;
  uint64_t high = (uint64_t)((x + (unsigned __int128)m * PRIME) >> 64);
  return high >= PRIME ? high - PRIME : high;
}

static residue multiply(residue a, residue b, uint64_t inverse)
{
  return reduce((unsigned __int128)a * b, inverse);
}

static residue add(residue a, residue b)
{
  residue sum = a + b;
  return sum >= PRIME ? sum - PRIME : sum;
}

static residue subtract(residue a, residue b) { return a >= b ? a - b : a + PRIME - b; }

static residue to_residue(uint64_t integer)
{
  return (residue)(((unsigned __int128)(integer % PRIME) << 64) % PRIME);
}

static residue power(residue base, uint64_t exponent, uint64_t inverse)
{
  residue result = to_residue(1);
  for (; exponent; exponent >>= 1) {
    if (exponent & 1) result = multiply(result, base, inverse);
    base = multiply(base, base, inverse);
  }
  return result;
}

static residue invert(residue a, uint64_t inverse) { return power(a, PRIME - 2, inverse); }

static residue from_double(double value, uint64_t inverse)
{
  int exponent;
  double mantissa = ldexp(frexp(fabs(value), &exponent), MANTISSA);
  residue two = to_residue(2), r = to_residue((uint64_t)mantissa);
  exponent -= MANTISSA;
  if (exponent < 0) two = to_residue((PRIME + 1) / 2);
  r = multiply(r, power(two, (uint64_t)abs(exponent), inverse), inverse);
  return value < 0 ? subtract(0, r) : r;
}

typedef struct {
  const mho_plan *plan;
  size_t n;
  uint64_t inverse;
  residue *entry; /* of H, as the plan's */
} field;

static void apply(const field *f, const residue *x, residue *y)
{
  memset(y, 0, f->n * sizeof *y);
  for (size_t e = 0; e < f->plan->entries; e++) {
    size_t i = (size_t)f->plan->entry[e].i, j = (size_t)f->plan->entry[e].j;
    y[i] = add(y[i], multiply(f->entry[e], x[j], f->inverse));
    if (i != j) y[j] = add(y[j], multiply(f->entry[e], x[i], f->inverse));
  }
}

/* Takes the rows out of x and, if something is left, makes it the next row. */
static int extend(const field *f, residue *rows, size_t *pivot, int count, residue *x)
{
  for (int k = 0; k < count; k++) {
    const residue *row = rows + (size_t)k * f->n;
    residue factor = x[pivot[k]];
    for (size_t i = 0; factor && i < f->n; i++)
      if (row[i]) x[i] = subtract(x[i], multiply(factor, row[i], f->inverse));
  }
  size_t first = 0;
  while (first < f->n && !x[first]) first++;
  if (first == f->n) return count;
  residue scale = invert(x[first], f->inverse), *row = rows + (size_t)count * f->n;
  for (size_t i = 0; i < f->n; i++) row[i] = multiply(x[i], scale, f->inverse);
  pivot[count] = first;
  return count + 1;
}

static int count_visible(const field *f, const residue *ends, residue *rows, residue *x,
                         size_t *pivot)
{
  int count = 0;
  for (size_t c = 0; c < 2; c++) {
    memcpy(x, ends + c * f->n, f->n * sizeof *x);
    count = extend(f, rows, pivot, count, x);
  }
  for (int next = 0; next < count && (size_t)count < f->n; next++) {
    apply(f, rows + (size_t)next * f->n, x);
    count = extend(f, rows, pivot, count, x);
  }
  return count;
}

/* mu_j, j < 2 n. */
static void moments(const field *f, const residue *ends, residue *x, residue *y, residue *moment)
{
  memcpy(x, ends, f->n * sizeof *x);
  for (size_t j = 0; j < 2 * f->n; j++) {
    residue sum = 0;
    for (size_t i = 0; i < f->n; i++)
      if (ends[f->n + i]) sum = add(sum, multiply(ends[f->n + i], x[i], f->inverse));
    moment[j] = sum;
    apply(f, x, y);
    memcpy(x, y, f->n * sizeof *x);
  }
}

/* Massey's algorithm; now, before and copy have room for count + 1. */
static int recurrence(const field *f, const residue *moment, size_t count, residue *now,
                      residue *before, residue *copy)
{
  size_t length = 0, shift = 1, size = count + 1;
  residue discrepancy_before = to_residue(1);
  memset(now, 0, size * sizeof *now);
  memset(before, 0, size * sizeof *before);
  now[0] = before[0] = to_residue(1);
  for (size_t j = 0; j < count; j++, shift++) {
    residue discrepancy = 0;
    for (size_t i = 0; i <= length; i++)
      discrepancy = add(discrepancy, multiply(now[i], moment[j - i], f->inverse));
    if (!discrepancy) continue;
    bool longer = 2 * length <= j;
    residue factor = multiply(discrepancy, invert(discrepancy_before, f->inverse), f->inverse);
    if (longer) memcpy(copy, now, size * sizeof *copy);
    for (size_t i = shift; i < size; i++)
      if (before[i - shift])
        now[i] = subtract(now[i], multiply(factor, before[i - shift], f->inverse));
    if (!longer) continue;
    length = j + 1 - length;
    memcpy(before, copy, size * sizeof *before);
    discrepancy_before = discrepancy;
    shift = 0;
  }
  return (int)length;
}

mho_status mho_exact_count(const mho_plan *plan, mho_exact_counts *counts)
{
  size_t n = (size_t)plan->sites, m = 2 * n;
  residue *entry = malloc((plan->entries + n * n + m + 2 * n + m + 3 * (m + 1)) * sizeof *entry);
  size_t *pivot = malloc(n * sizeof *pivot);
  mho_status status = entry && pivot ? MHO_OK : MHO_ERR_MEMORY;
  if (status == MHO_OK) {
    field f = {plan, n, negative_inverse(), entry};
    residue *rows = entry + plan->entries, *ends = rows + n * n, *x = ends + m, *y = x + n;
    residue *moment = y + n, *room = moment + m;
    for (size_t e = 0; e < plan->entries; e++)
      entry[e] = from_double(plan->entry[e].value_ev, f.inverse);
    for (size_t k = 0; k < m; k++) ends[k] = from_double(plan->vector[k], f.inverse);
    counts->visible = count_visible(&f, ends, rows, x, pivot);
    moments(&f, ends, x, y, moment);
    counts->poles = recurrence(&f, moment, m, room, room + m + 1, room + 2 * (m + 1));
    for (counts->first = 0; (size_t)counts->first < m && !moment[counts->first];) counts->first++;
  }
  free(entry);
  free(pivot);
  return status;
}
