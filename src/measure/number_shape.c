/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "measure/number_shape.h"

enum { LONGEST = 15, DIGITS = 12, EXPONENT_DIGITS = 4, NO_DIGIT = 0x80 };

/* Marks the digits from `from` on and returns how many there are. */
static int take_digits(mho_number_shape *shape, const char *s, int from, int length)
{
  int at = from;
  for (; at < length && (unsigned)(s[at] - '0') < 10; at++) shape->digits |= 1u << at;
  return at - from;
}

static void fix(mho_number_shape *shape, const char *s, int at)
{
  shape->fixed |= 1u << at;
  shape->same[at] = (uint8_t)s[at];
}

/* Places of the digits among bytes [from, to), the last at order[last]. */
static void set_order(mho_number_shape *shape, int from, int to, int last)
{
  for (int at = to; at-- > from;)
    if (shape->digits >> at & 1) shape->order[last--] = (uint8_t)at;
}

void mho_shape_learn(mho_number_shape *shape, const char *s, const char *end)
{
  *shape = (mho_number_shape){0};
  if (*s == '-') s++;
  if (end - s > LONGEST) return;
  int length = (int)(end - s), at = take_digits(shape, s, 0, length), count = at, exponent = 0;
  if (at < length && s[at] == '.') {
    fix(shape, s, at++);
    shape->fraction = take_digits(shape, s, at, length);
    at += shape->fraction;
    count += shape->fraction;
  }
  int mantissa = at;
  if (at + 1 < length && (s[at] == 'e' || s[at] == 'E') && (s[at + 1] == '-' || s[at + 1] == '+')) {
    fix(shape, s, at);
    shape->sign_at = at + 1;
    exponent = take_digits(shape, s, at + 2, length);
    at += 2 + exponent;
  }
  if (at != length || count == 0 || count > DIGITS || exponent > EXPONENT_DIGITS) return;
  memset(shape->order, NO_DIGIT, sizeof shape->order);
  set_order(shape, 0, mantissa, EXPONENT_DIGITS + DIGITS - 1);
  set_order(shape, mantissa, length, EXPONENT_DIGITS - 1);
  shape->length = length;
  shape->seen = (2u << length) - 1;
}
