/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Cosines of many angles in degrees, for compiler vectors.  With the nearest
 * multiple k of 90 degrees taken off, which is exact, what is left lies within 45
 * degrees, where Taylor's series of sine and cosine end below 1e-17; so multiples
 * of 90 degrees are exact, and near them no digit is lost.
 */
#include <math.h>
#include <stdbool.h>
#include <stdint.h>
#include <string.h>

#include <mho/molecule.h>

#include "base/processor.h"

#define RADIANS_PER_DEGREE 0.017453292519943295769

/* The nearest integer of |x| < 2^51, as bits too. */
#define ROUNDER 0x1.8p52

FOR_EVERY_PROCESSOR
static void cosines(size_t count, const double *angle_deg, double *cosine)
{
  for (size_t i = 0; i < count; i++) {
    double shifted = angle_deg[i] * (1.0 / 90.0) + ROUNDER;
    uint64_t quarter;
    memcpy(&quarter, &shifted, sizeof quarter);
    double rest = angle_deg[i] - 90.0 * (shifted - ROUNDER), x = rest * RADIANS_PER_DEGREE;
    double z = x * x;
    double s = -1.0 / 1307674368000;
    s = s * z + 1.0 / 6227020800;
    s = s * z - 1.0 / 39916800;
    s = s * z + 1.0 / 362880;
    s = s * z - 1.0 / 5040;
    s = s * z + 1.0 / 120;
    s = s * z - 1.0 / 6;
    s = s * z * x + x;
    double c = 1.0 / 20922789888000;
    c = c * z - 1.0 / 87178291200;
    c = c * z + 1.0 / 479001600;
    c = c * z - 1.0 / 3628800;
    c = c * z + 1.0 / 40320;
    c = c * z - 1.0 / 720;
    c = c * z + 1.0 / 24;
    c = c * z - 0.5;
    c = c * z + 1.0;
    s = fabs(rest) == 30.0 ? copysign(0.5, rest) : s;
    double value = quarter & 1 ? -s : c; /* cos(90 + x) = -sin(x) */
    cosine[i] = quarter & 2 ? -value : value;
  }
}

void mho_cos_deg_many(size_t count, const double *angle_deg, double *cosine)
{
  bool small = true;
  for (size_t i = 0; i < count; i++) small &= fabs(angle_deg[i]) <= 1e9;
  if (small) cosines(count, angle_deg, cosine);
  for (size_t i = 0; !small && i < count; i++) cosine[i] = mho_cos_deg(angle_deg[i]);
}
