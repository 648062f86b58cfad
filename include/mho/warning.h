/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Named warnings: the same word in tables, JSON and reports.  A set of them
 * is an unsigned with one bit a warning.
 */
#ifndef MHOLECULE_WARNING_H
#define MHOLECULE_WARNING_H

#include <mho/version.h>

/* X(code, word, sentence) */
#define MHO_WARNING_LIST(X)                                                    \
  X(MHO_WARN_CHARGED, "charged",                                               \
    "the pi system carries a charge; the model does not screen it")            \
  X(MHO_WARN_OPEN_SHELL, "open-shell",                                         \
    "an odd number of electrons or a partly filled frontier; one-electron "    \
    "levels are a poor picture of it")                                         \
  X(MHO_WARN_METAL, "metal", "a metal atom is left out of the pi system")      \
  X(MHO_WARN_NO_PI_PATH, "no-pi-path",                                         \
    "no path of hoppings joins the contacts; the pi model gives no "           \
    "conductance")                                                             \
  X(MHO_WARN_DIFFERENT_FRAGMENTS, "different-fragments",                       \
    "the contacts sit on different conjugated fragments")                      \
  X(MHO_WARN_NEAR_POLE, "near-pole",                                           \
    "a resonance lies at the Fermi level; conductance depends on its exact "   \
    "place")                                                                   \
  X(MHO_WARN_NEAR_NODE, "near-node",                                           \
    "the transmission has a node at the energy in question: no prediction of " \
    "a value, other paths will carry the current")                             \
  X(MHO_WARN_NEAR_DEGENERATE_FRONTIER, "near-degenerate-frontier",             \
    "HOMO and LUMO are less than 0.2 eV apart")                                \
  X(MHO_WARN_STRONG_TWIST, "strong-twist",                                     \
    "a bond is twisted by more than 70 degrees; sigma and through-space "      \
    "paths matter")                                                            \
  X(MHO_WARN_LONG, "long",                                                     \
    "the contacts are more than 4 nm apart; hopping transport is likely")      \
  X(MHO_WARN_UNIFORM_BONDS, "uniform-bonds",                                   \
    "single and double bonds of a chain have one hopping; such a chain does "  \
    "not decay with length")                                                   \
  X(MHO_WARN_BLOCKADE, "blockade",                                             \
    "a level couples more weakly than kT; charging is likely to matter")       \
  X(MHO_WARN_UNPARAMETERISED, "unparameterised",                               \
    "an atom has no parameters of its own")                                    \
  X(MHO_WARN_NOT_CONVERGED, "not-converged", "an iteration did not converge")  \
  X(MHO_WARN_OUTSIDE_CALIBRATION, "outside-calibration",                       \
    "the molecule lies outside what the calibration rests on")                 \
  X(MHO_WARN_OUTSIDE_BAND, "outside-band",                                     \
    "an energy in question lies outside the band of an electrode, where "      \
    "nothing is transmitted")

enum {
#define MHO_WARNING_INDEX(code, word, sentence) code##_INDEX,
  MHO_WARNING_LIST(MHO_WARNING_INDEX)
#undef MHO_WARNING_INDEX
  MHO_WARNING_COUNT
};

enum {
#define MHO_WARNING_BIT(code, word, sentence) code = 1 << code##_INDEX,
  MHO_WARNING_LIST(MHO_WARNING_BIT)
#undef MHO_WARNING_BIT
};

MHO_BEGIN_DECLARATIONS

/* Word and sentence of warning `index` (0 .. MHO_WARNING_COUNT-1). */
MHO_API const char *mho_warning_word(int index);
MHO_API const char *mho_warning_sentence(int index);

MHO_END_DECLARATIONS

#endif
