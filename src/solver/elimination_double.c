/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "solver/plan.h"

#define REAL double
#define ROUNDOFF UNIT_ROUNDOFF
#define SMALLEST 1e-280
#define TRUST_RANK false
#define NAME(x) x##_double
#include "solver/elimination.inc"
