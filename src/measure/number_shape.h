/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Numbers of one form, as a column of a file has them: D.DDDDDDe-DD, say.
 *
 * The form of a number is learned once; after that sixteen bytes are compared
 * with it and their digits summed in one go.  The digits and the power of ten
 * are those that mho_decimal_read finds, and so is the value.
 */
#ifndef MHOLECULE_MEASURE_NUMBER_SHAPE_H
#define MHOLECULE_MEASURE_NUMBER_SHAPE_H

#include "base/processor.h"
#include "measure/decimal.h"

#if defined(__x86_64__) && defined(__GNUC__) && !defined(__clang__)
#include <immintrin.h>
#define MHO_HAS_NUMBER_SHAPES 1
#define MHO_SHAPE_PROCESSOR __attribute__((target("arch=x86-64-v3")))
#endif

typedef struct {
  int length;       /* bytes behind a minus sign; 0: no form is known */
  int fraction;     /* digits behind the point */
  int sign_at;      /* of the exponent, 0: there is no exponent */
  uint32_t seen;    /* the bits of the number and of the byte behind it */
  uint32_t digits;  /* bit i: byte i is a digit */
  uint32_t fixed;   /* bit i: byte i is that of `same` */
  uint8_t same[16]; /* point and letter of the exponent */
  uint8_t order[16]; /* byte for a digit: 4 of the exponent, 12 of the rest */
} mho_number_shape;

/* The form of the number from s to end, if it is one that can be used. */
void mho_shape_learn(mho_number_shape *shape, const char *s, const char *end);

#ifdef MHO_HAS_NUMBER_SHAPES
/* The number at s, or false where it has another form.  As with
 * mho_decimal_read what follows is for the caller to judge. */
MHO_SHAPE_PROCESSOR static inline __attribute__((always_inline)) bool
mho_shape_read(const mho_number_shape *shape, const char *s, const char **end, double *value)
{
  bool negative = *s == '-';
  s += negative;
  __m128i text = _mm_loadu_si128((const __m128i *)s);
  __m128i digit = _mm_sub_epi8(text, _mm_set1_epi8('0'));
  __m128i is_digit = _mm_cmpeq_epi8(_mm_min_epu8(digit, _mm_set1_epi8(9)), digit);
  __m128i is_same = _mm_cmpeq_epi8(text, _mm_loadu_si128((const __m128i *)shape->same));
  uint32_t other = ((uint32_t)_mm_movemask_epi8(is_digit) & shape->seen) ^ shape->digits;
  other |= ~(uint32_t)_mm_movemask_epi8(is_same) & shape->fixed;
  if (other || !shape->length) return false;
  /* Digits to pairs, pairs to fours: the exponent and 3 times four digits. */
  __m128i sum = _mm_shuffle_epi8(digit, _mm_loadu_si128((const __m128i *)shape->order));
  sum = _mm_maddubs_epi16(sum, _mm_set1_epi16(10 | 1 << 8));
  sum = _mm_madd_epi16(sum, _mm_set1_epi32(100 | 1 << 16));
  uint64_t low = (uint64_t)_mm_cvtsi128_si64(sum), high = (uint64_t)_mm_extract_epi64(sum, 1);
  uint64_t m = (low >> 32) * 100000000 + (uint32_t)high * UINT64_C(10000) + (high >> 32);
  int exponent = (int)(uint32_t)low;
  if (shape->sign_at) {
    char sign = s[shape->sign_at];
    if (sign != '-' && sign != '+') return false;
    if (sign == '-') exponent = -exponent;
  }
  exponent -= shape->fraction;
  if (exponent < 0 && exponent >= -22) *value = (double)(int64_t)m / mho_power10[-exponent];
  else if (!mho_decimal_scale(m, exponent, value)) return false;
  if (negative) *value = -*value;
  *end = s + shape->length;
  return true;
}
#endif

#endif
