/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Energies side by side in a register.  Wider vectors than those of the processor
 * the compiler keeps in memory, so code with vectors as values is compiled once for
 * each width: lanes_2.c, lanes_4.c and lanes_8.c define WIDTH and include it.  Who
 * calls it chooses by OF_WIDEST.  All round alike.
 */
#ifndef MHOLECULE_SOLVER_LANES_H
#define MHOLECULE_SOLVER_LANES_H

#include "base/processor.h"

#ifdef SEVERAL_PROCESSORS
#define OF_WIDEST(name)                                                        \
  (__builtin_cpu_supports("x86-64-v4")   ? name##_8                            \
   : __builtin_cpu_supports("x86-64-v3") ? name##_4                            \
                                         : name##_2)
#else
#define OF_WIDEST(name) name##_2
#endif

#ifdef WIDTH

#define NAME_OF(name, width) name##_##width
#define NAME_AT(name, width) NAME_OF(name, width)
#define NAME(name) NAME_AT(name, WIDTH)

/* All functions with vectors as values are inlined. */
#pragma GCC diagnostic ignored "-Wpsabi"

/* Loaded and stored by their address. */
#define OF_LANES __attribute__((vector_size(WIDTH * sizeof(double)), aligned(8), may_alias))
typedef double vector OF_LANES;
typedef long long bits OF_LANES;

#define AT(array, v) (*(vector *)((array) + (v) * WIDTH))
#define ABSOLUTE(x) ((vector)((bits)(x) & ((bits){0} + 0x7fffffffffffffffLL)))

#endif

#endif
