/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * cmocka with what every unit test needs; its own float comparison works in
 * single precision, so ours stands here.
 */
#ifndef MHOLECULE_TESTS_CHECK_H
#define MHOLECULE_TESTS_CHECK_H

#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <string.h>

#include <cmocka.h>

/* |actual - expected| <= tolerance, and both finite. */
#define assert_near(actual, expected, tolerance)                               \
  do {                                                                         \
    double actual_ = (actual), expected_ = (expected);                         \
    if (!(fabs(actual_ - expected_) <= (tolerance)))                           \
      fail_msg("%s = %.17g, expected %.17g within %g", #actual, actual_,       \
               expected_, (double)(tolerance));                                \
  } while (0)

/* |actual - expected| <= tolerance * |expected|. */
#define assert_close(actual, expected, tolerance)                              \
  assert_near(actual, expected, (tolerance)*fabs(expected))

#endif
