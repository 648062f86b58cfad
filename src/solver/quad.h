/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * 113-bit numbers by the compiler's own arithmetic: __float128 on x86, long
 * double where that already has 113 bits.
 */
#ifndef MHOLECULE_SOLVER_QUAD_H
#define MHOLECULE_SOLVER_QUAD_H

#include <float.h>
#include <math.h>

#if defined(__SIZEOF_FLOAT128__)
typedef __float128 mho_quad;
typedef _Complex float __attribute__((mode(TC))) mho_quad_complex;
#elif LDBL_MANT_DIG == 113
typedef long double mho_quad;
typedef long double _Complex mho_quad_complex;
#else
#error "a 113-bit floating type is needed"
#endif

#define QUAD_ROUNDOFF ((mho_quad)0x1p-113)

static inline mho_quad mho_quad_abs(mho_quad x) { return x < 0 ? -x : x; }

/* Two steps of Newton from the double; x in the range of a double. */
static inline mho_quad mho_quad_sqrt(mho_quad x)
{
  if (!(x > 0)) return 0;
  mho_quad scale = 1;
  for (; x < 0x1p-400; x *= (mho_quad)0x1p400) scale *= (mho_quad)0x1p-200;
  mho_quad root = sqrt((double)x);
  for (int step = 0; step < 2; step++) root = (root + x / root) / 2;
  return root * scale;
}

/* |re| + |im|. */
static inline mho_quad mho_quad_size(mho_quad_complex z)
{
  return mho_quad_abs(__real__ z) + mho_quad_abs(__imag__ z);
}

#endif
