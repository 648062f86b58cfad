/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Numbers in text.  strtod and printf follow the locale; both are therefore
 * called with the C locale, after the grammar has been checked here, so that
 * `0x1p3`, `inf`, `nan` and `1,5` are never numbers.
 */
#include <mho/quantity.h>

#include <locale.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static const char *skip_digits(const char *s)
{
  while (*s >= '0' && *s <= '9') s++;
  return s;
}

/* End of the decimal number at s, or s. */
static const char *number_end(const char *s)
{
  const char *start = s;
  if (*s == '+' || *s == '-') s++;
  const char *digits = s;
  s = skip_digits(s);
  long count = s - digits;
  if (*s == '.') {
    const char *fraction = s + 1;
    s = skip_digits(fraction);
    count += s - fraction;
  }
  if (count == 0) return start;
  if (*s == 'e' || *s == 'E') {
    const char *exponent = s + 1;
    if (*exponent == '+' || *exponent == '-') exponent++;
    const char *end = skip_digits(exponent);
    if (end > exponent) s = end;
  }
  return s;
}

bool mho_number_read(const char *text, const char **end, double *value)
{
  const char *stop = number_end(text);
  *end = text;
  if (stop == text) return false;
  locale_t c_locale = newlocale(LC_ALL_MASK, "C", (locale_t)0);
  if (!c_locale) return false;
  /* strtod stops at the same place: the grammar above is a part of its own,
   * except that "0x" would go on; a copy of that one digit avoids it. */
  locale_t previous = uselocale(c_locale);
  double result = 0.0;
  size_t length = (size_t)(stop - text);
  char small[64];
  char *copy = length < sizeof small ? small : malloc(length + 1);
  bool good = copy != NULL;
  if (good) {
    memcpy(copy, text, length);
    copy[length] = '\0';
    result = strtod(copy, NULL);
    good = isfinite(result);
  }
  if (copy != small) free(copy);
  uselocale(previous);
  freelocale(c_locale);
  if (!good) return false;
  *value = result;
  *end = stop;
  return true;
}

int mho_number_write(char *buffer, size_t size, int digits, double value)
{
  locale_t c_locale = newlocale(LC_ALL_MASK, "C", (locale_t)0);
  locale_t previous = c_locale ? uselocale(c_locale) : (locale_t)0;
  if (value == 0.0) value = 0.0; /* no negative zero in a table */
  int length = snprintf(buffer, size, "%.*g", digits, value);
  if (c_locale) {
    uselocale(previous);
    freelocale(c_locale);
  }
  return length;
}
