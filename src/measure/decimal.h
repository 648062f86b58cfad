/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Decimal numbers at the speed of the disk, correctly rounded.
 *
 * Up to eight digits are taken at once from one 64-bit word.  With the digits
 * as an integer m and the power of ten 10^k: if m < 2^53 and |k| <= 22 both
 * are exact doubles and one operation rounds correctly (W. D. Clinger, Proc.
 * PLDI 1990).  Up to 19 digits and |k| <= 27 both are exact in the 64-bit
 * significand of x87; its result is rounded again to 53 bits, which can only
 * go wrong next to a tie, and there, as everywhere else, mho_number_read
 * decides.
 */
#ifndef MHOLECULE_MEASURE_DECIMAL_H
#define MHOLECULE_MEASURE_DECIMAL_H

#include <mho/quantity.h>

#include <float.h>
#include <stdint.h>
#include <string.h>

enum { MHO_DECIMAL_PADDING = 16 }; /* bytes that may be read behind the text */

static const double mho_power10[23] = {
    1e0,  1e1,  1e2,  1e3,  1e4,  1e5,  1e6,  1e7,  1e8,  1e9,  1e10, 1e11,
    1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22};

/* Digits at s, at most eight, as *value; returns how many there are. */
static inline int mho_decimal_digits(const char *s, uint64_t *value)
{
  static const uint32_t power[9] = {1,      10,      100,      1000,     10000,
                                    100000, 1000000, 10000000, 100000000};
  uint64_t word;
  memcpy(&word, s, 8);
  /* The high bit of a byte is set where it is not a digit. */
  uint64_t digits = word ^ 0x3030303030303030u;
  uint64_t other = (((digits & 0x7f7f7f7f7f7f7f7fu) + 0x7676767676767676u) | digits) &
                   0x8080808080808080u;
  int count = other ? __builtin_ctzll(other) >> 3 : 8;
  if (count == 0) return 0;
  digits <<= 8 * (8 - count);
  digits = digits * 10 + (digits >> 8);
  digits = (((digits & 0x000000ff000000ffu) * 0x000f424000000064u) +
            (((digits >> 16) & 0x000000ff000000ffu) * 0x0000271000000001u)) >> 32;
  *value = *value * power[count] + (uint32_t)digits;
  return count;
}

/* Correctly rounded m * 10^exponent where 64 bits suffice to be sure. */
static inline bool mho_decimal_scale(uint64_t m, int exponent, double *value)
{
  if (m < (UINT64_C(1) << 53) && exponent >= -22 && exponent <= 22) {
    *value = exponent < 0 ? (double)(int64_t)m / mho_power10[-exponent]
                          : (double)(int64_t)m * mho_power10[exponent];
    return true;
  }
#if LDBL_MANT_DIG == 64
  static const long double power[28] = {
      1e0L,  1e1L,  1e2L,  1e3L,  1e4L,  1e5L,  1e6L,  1e7L,  1e8L,  1e9L,
      1e10L, 1e11L, 1e12L, 1e13L, 1e14L, 1e15L, 1e16L, 1e17L, 1e18L, 1e19L,
      1e20L, 1e21L, 1e22L, 1e23L, 1e24L, 1e25L, 1e26L, 1e27L};
  if (exponent < -27 || exponent > 27) return false;
  long double extended = exponent < 0 ? (long double)m / power[-exponent]
                                      : (long double)m * power[exponent];
  uint64_t significand;
  memcpy(&significand, &extended, 8);
  uint64_t tail = significand & 0x7ff;
  if (tail >= 0x3ff && tail <= 0x401) return false;
  *value = (double)extended;
  return true;
#else
  return false;
#endif
}

/* The number at s, or false where there is none.  The text ends in something
 * that is no part of a number, and MHO_DECIMAL_PADDING more bytes can be
 * read. */
static inline bool mho_decimal_read(const char *s, const char **end, double *value)
{
  const char *p = s;
  bool negative = *p == '-';
  if (*p == '-' || *p == '+') p++;
  uint64_t m = 0;
  const char *digits = p;
  while ((unsigned)(*p - '0') < 10 && p - digits < 19) m = m * 10 + (unsigned)(*p++ - '0');
  long count = p - digits, fraction = 0;
  if (*p == '.') {
    digits = ++p;
    int taken;
    while (count + (p - digits) <= 11 && (taken = mho_decimal_digits(p, &m)) > 0) {
      p += taken;
      if (taken < 8) break;
    }
    while (count + (p - digits) < 19 && (unsigned)(*p - '0') < 10)
      m = m * 10 + (unsigned)(*p++ - '0');
    fraction = p - digits;
  }
  count += fraction;
  if (count == 0) return false;
  int exponent = 0;
  if (*p == 'e' || *p == 'E') {
    const char *q = p + 1;
    bool below = *q == '-';
    if (*q == '-' || *q == '+') q++;
    if ((unsigned)(*q - '0') < 10) {
      while ((unsigned)(*q - '0') < 10 && exponent < 1000)
        exponent = exponent * 10 + (*q++ - '0');
      if (below) exponent = -exponent;
      p = q;
    }
  }
  if ((unsigned)(*p - '0') < 10 || !mho_decimal_scale(m, exponent - (int)fraction, value))
    return mho_number_read(s, end, value);
  if (negative) *value = -*value;
  *end = p;
  return true;
}

#endif
