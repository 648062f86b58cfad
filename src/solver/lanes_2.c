/* SPDX-License-Identifier: GPL-3.0-or-later */
#define WIDTH 2
#include "solver/program_lanes.inc"
#include "solver/reduction_lanes.inc"
#include "solver/spectrum_lanes.inc"
