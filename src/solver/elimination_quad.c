/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "solver/plan.h"
#include "solver/quad.h"

#define REAL mho_quad
#define ROUNDOFF QUAD_ROUNDOFF
#define SMALLEST 0
#define TRUST_RANK true
#define NAME(x) x##_quad
#include "solver/elimination.inc"
