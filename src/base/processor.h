/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A function compiled for several processors, the best chosen when the program
 * starts.  Without fast-math or contraction all of them round alike.  Code with
 * vectors as values is compiled for each width instead (solver/lanes.h).
 */
#ifndef MHOLECULE_BASE_PROCESSOR_H
#define MHOLECULE_BASE_PROCESSOR_H

#if defined(__x86_64__) && defined(__GNUC__) && !defined(__clang__) &&             \
    !defined(__SANITIZE_ADDRESS__)
#define SEVERAL_PROCESSORS
#define FOR_EVERY_PROCESSOR                                                    \
  __attribute__((target_clones("arch=x86-64-v4", "arch=x86-64-v3", "default")))
#else
#define FOR_EVERY_PROCESSOR
#endif

/* Part of such functions: apart it would be for the plainest processor only. */
#ifdef __GNUC__
#define INLINED static inline __attribute__((always_inline))
#else
#define INLINED static inline
#endif

#endif
