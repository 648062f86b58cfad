/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Ranks over the integers modulo a prime.  The doubles of H are m 2^e, so H
 * maps into that field exactly; a rank can only fall there, and does so where
 * the prime divides one certain determinant, which happens by chance in about
 * one of 1e13 matrices (bits of the determinant over bits of the prime, against
 * the number of primes of that size).
 *
 *   poles     length of the shortest recurrence of mu_j = v_r^T H^j v_l
 *             (J. L. Massey, IEEE Trans. Inf. Theory 15, 122 (1969)),
 *   visible   dimension of the smallest space with V = (v_l, v_r) that H keeps.
 *             H + V S V^T keeps the same one, and there its levels are single, as S
 *             splits equal ones, and seen by w = V s, for all S and s but those on
 *             some surface: length of the recurrence of w^T (H + V S V^T)^j w.
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

/* Coefficients that nothing in a molecule knows: of the vector w, and of S. */
typedef struct {
  residue w[2], s[2][2];
} feedback;

static feedback draw(void)
{
  residue r[5];
  uint64_t state = 0x9e3779b97f4a7c15ULL;
  for (int k = 0; k < 5; k++) { /* G. L. Steele et al., OOPSLA 2014: splitmix64 */
    uint64_t x = state += 0x9e3779b97f4a7c15ULL;
    x = (x ^ x >> 30) * 0xbf58476d1ce4e5b9ULL;
    x = (x ^ x >> 27) * 0x94d049bb133111ebULL;
    r[k] = (x ^ x >> 31) % PRIME;
  }
  return (feedback){{r[0], r[1]}, {{r[2], r[3]}, {r[3], r[4]}}};
}

static residue overlap(const field *f, const residue *v, const residue *x)
{
  residue sum = 0;
  for (size_t i = 0; i < f->n; i++)
    if (v[i]) sum = add(sum, multiply(v[i], x[i], f->inverse));
  return sum;
}

static void add_scaled(const field *f, residue factor, const residue *v, residue *x)
{
  for (size_t i = 0; factor && i < f->n; i++)
    if (v[i]) x[i] = add(x[i], multiply(factor, v[i], f->inverse));
}

/* moment[j] = b^T (H + V S V^T)^j a, j < 2 n; no S: b^T H^j a.  V has both ends. */
static void moments(const field *f, const residue *a, const residue *b, const residue *ends,
                    const feedback *by, residue *x, residue *y, residue *moment)
{
  memcpy(x, a, f->n * sizeof *x);
  for (size_t j = 0; j < 2 * f->n; j++) {
    moment[j] = overlap(f, b, x);
    apply(f, x, y);
    residue seen[2];
    for (size_t c = 0; by && c < 2; c++) seen[c] = overlap(f, ends + c * f->n, x);
    for (size_t c = 0; by && c < 2; c++) {
      residue sum = add(multiply(by->s[c][0], seen[0], f->inverse),
                        multiply(by->s[c][1], seen[1], f->inverse));
      add_scaled(f, sum, ends + c * f->n, y);
    }
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
  residue *entry = malloc((plan->entries + 7 * m + 3) * sizeof *entry);
  if (!entry) return MHO_ERR_MEMORY;
  field f = {plan, n, negative_inverse(), entry};
  residue *ends = entry + plan->entries, *x = ends + m, *y = x + n, *w = y + n;
  residue *moment = w + n, *room = moment + m;
  feedback by = draw();
  for (size_t e = 0; e < plan->entries; e++)
    entry[e] = from_double(plan->entry[e].value_ev, f.inverse);
  for (size_t k = 0; k < m; k++) ends[k] = from_double(plan->vector[k], f.inverse);
  memset(w, 0, n * sizeof *w);
  for (size_t c = 0; c < 2; c++) add_scaled(&f, by.w[c], ends + c * n, w);
  moments(&f, w, w, ends, &by, x, y, moment);
  counts->visible = recurrence(&f, moment, m, room, room + m + 1, room + 2 * (m + 1));
  moments(&f, ends, ends + n, ends, NULL, x, y, moment);
  counts->poles = recurrence(&f, moment, m, room, room + m + 1, room + 2 * (m + 1));
  for (counts->first = 0; (size_t)counts->first < m && !moment[counts->first];) counts->first++;
  free(entry);
  return MHO_OK;
}
