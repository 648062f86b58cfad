/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/processor.h"

#ifdef SEVERAL_PROCESSORS
#pragma GCC target("arch=x86-64-v3")
#define WIDTH 4
#include "solver/program_lanes.inc"
#include "solver/reduction_lanes.inc"
#include "solver/spectrum_lanes.inc"
#endif
