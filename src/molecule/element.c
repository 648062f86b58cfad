/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "molecule/element.h"

#include <mho/graph.h>

static const char symbol[ELEMENT_LIMIT + 1][3] = {
    "*",  "H",  "He", "Li", "Be", "B",  "C",  "N",  "O",  "F",  "Ne", "Na",
    "Mg", "Al", "Si", "P",  "S",  "Cl", "Ar", "K",  "Ca", "Sc", "Ti", "V",
    "Cr", "Mn", "Fe", "Co", "Ni", "Cu", "Zn", "Ga", "Ge", "As", "Se", "Br",
    "Kr", "Rb", "Sr", "Y",  "Zr", "Nb", "Mo", "Tc", "Ru", "Rh", "Pd", "Ag",
    "Cd", "In", "Sn", "Sb", "Te", "I",  "Xe", "Cs", "Ba", "La", "Ce", "Pr",
    "Nd", "Pm", "Sm", "Eu", "Gd", "Tb", "Dy", "Ho", "Er", "Tm", "Yb", "Lu",
    "Hf", "Ta", "W",  "Re", "Os", "Ir", "Pt", "Au", "Hg", "Tl", "Pb", "Bi",
    "Po", "At", "Rn", "Fr", "Ra", "Ac", "Th", "Pa", "U",  "Np", "Pu", "Am",
    "Cm", "Bk", "Cf", "Es", "Fm", "Md", "No", "Lr", "Rf", "Db", "Sg", "Bh",
    "Hs", "Mt", "Ds", "Rg", "Cn", "Nh", "Fl", "Mc", "Lv", "Ts", "Og"};

const char *mho_element_symbol(int element)
{
  return element >= 0 && element <= ELEMENT_LIMIT ? symbol[element] : NULL;
}

int mho_element_read(const char *text, size_t *length)
{
  int best = -1;
  *length = 0;
  for (int i = 0; i <= ELEMENT_LIMIT; i++) {
    if (symbol[i][0] != text[0]) continue;
    if (symbol[i][1] == '\0' && *length == 0) {
      best = i;
      *length = 1;
    } else if (symbol[i][1] && symbol[i][1] == text[1]) {
      best = i;
      *length = 2;
    }
  }
  return best;
}

/* Valence electrons of the elements that form molecules; 0 for the others. */
static int valence_electrons(int element)
{
  switch (element) {
    case ELEMENT_H: return 1;
    case ELEMENT_B: return 3;
    case ELEMENT_C: case ELEMENT_SI: case 32: return 4;
    case ELEMENT_N: case ELEMENT_P: case 33: return 5;
    case ELEMENT_O: case ELEMENT_S: case 34: case 52: return 6;
    case ELEMENT_F: case ELEMENT_CL: case ELEMENT_BR: case ELEMENT_I: case 85:
      return 7;
    default: return 0;
  }
}

bool mho_element_is_metal(int element)
{
  switch (element) {
    case 0: case 2: case 10: case 18: case 36: case 54: case 86: return false;
    default: return valence_electrons(element) == 0;
  }
}

/* Octet rule with the charge as a shift of the group: N+ binds like C, O+
 * like N, C+ like B.  From the third period on, and for neutral N (as
 * OpenSMILES has it), pairs may open: S 2, 4, 6; P 3, 5; I 1, 3, 5, 7. */
int mho_element_valence(int element, int charge, int used)
{
  int electrons = valence_electrons(element);
  if (electrons == 0) return used;
  electrons -= charge;
  if (element == ELEMENT_H) {
    int hydrogen = electrons == 1;
    return used <= hydrogen ? hydrogen : -1;
  }
  if (electrons < 0 || electrons > 8) return -1;
  int valence = electrons <= 4 ? electrons : 8 - electrons;
  int largest = valence;
  if (element > 10 || (element == ELEMENT_N && charge == 0)) largest = electrons;
  while (valence < used && valence + 2 <= largest) valence += 2;
  return used <= valence ? valence : -1;
}
