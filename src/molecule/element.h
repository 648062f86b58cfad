/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What the periodic table says about an element.
 */
#ifndef MHOLECULE_MOLECULE_ELEMENT_H
#define MHOLECULE_MOLECULE_ELEMENT_H

#include <stdbool.h>
#include <stddef.h>

enum {
  ELEMENT_H = 1, ELEMENT_B = 5, ELEMENT_C, ELEMENT_N, ELEMENT_O, ELEMENT_F,
  ELEMENT_SI = 14, ELEMENT_P, ELEMENT_S, ELEMENT_CL, ELEMENT_BR = 35,
  ELEMENT_I = 53, ELEMENT_AU = 79, ELEMENT_LIMIT = 118
};

/* Atomic number of the longest symbol at the start of text; -1 if none. */
int mho_element_read(const char *text, size_t *length);

bool mho_element_is_metal(int element);

/* The smallest usual valence of an element in a charge state that is at least
 * `used`; -1 where `used` exceeds the largest one; `used` itself for elements
 * without usual valences (metals, noble gases, the wildcard). */
int mho_element_valence(int element, int charge, int used);

#endif
