/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * IEEE binary128 by the compiler's own arithmetic: __float128 on x86, long
 * double where that already has 113 bits.
 */
#include "solver/plan.h"

#if defined(__SIZEOF_FLOAT128__)
#define REAL __float128
#elif LDBL_MANT_DIG == 113
#define REAL long double
#else
#error "a 113-bit floating type is needed"
#endif

#define ROUNDOFF ((REAL)0x1p-113)
#define SMALLEST 0
#define TRUST_RANK true
#define NAME(x) x##_quad
#include "solver/elimination.inc"
