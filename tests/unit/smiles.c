/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "check.h"

#include <mho/graph.h>

#include <stdlib.h>

#include "molecule/element.h"

static mho_status read_error(const char *text, mho_error *error)
{
  mho_graph graph;
  mho_graph_init(&graph);
  mho_error_init(error);
  mho_status status = mho_smiles_read(text, NULL, &graph, error);
  if (status != MHO_OK) assert_int_equal(graph.atom_count, 0);
  mho_graph_clear(&graph);
  return status;
}

/* What the grammar of OpenSMILES 1.0 does not allow. */
static void an_error_gives_column_and_reason(void **state)
{
  (void)state;
  static const struct {
    const char *text, *message;
  } bad[] = {
      {"c1ccc(c", "column 6: '(' is never closed"},
      {"CC(C", "column 3: '(' is never closed"},
      {"CC)C", "column 3: ')' was never opened"},
      {"C()C", "column 3: the branch is empty"},
      {"(C)C", "column 1: a branch must follow an atom"},
      {"C((C)C)", "column 3: a branch must follow an atom"},
      {"C=(C)C", "column 2: the bond belongs behind the '('"},
      {"C(C=)C", "column 4: a bond leads nowhere"},
      {"CC=", "column 3: a bond leads nowhere"},
      {"C=.C", "column 2: a bond leads nowhere"},
      {"=CC", "column 1: a bond must follow an atom"},
      {"C==C", "column 3: two bonds in a row"},
      {"C1CC", "column 2: ring closure 1 is never closed"},
      {"C%12CC", "column 2: ring closure 12 is never closed"},
      {"C%1C", "column 2: '%' needs two digits"},
      {"1CC1", "column 1: a ring closure must follow an atom"},
      {"C11", "column 3: ring closure 1 bonds an atom to itself"},
      {"C1C1", "column 4: ring closure 1 bonds two atoms a second time"},
      {"C12CCC12", "column 8: ring closure 2 bonds two atoms a second time"},
      {"C=1CCC#1", "column 8: ring closure 1 has one bond order here and another at column 3"},
      {"C.", "column 2: '.' stands between two parts"},
      {".C", "column 1: '.' stands between two parts"},
      {"C..C", "column 3: '.' stands between two parts"},
      {"C(C.)C", "column 4: '.' stands between two parts"},
      {"", "column 1: there is no atom"},
      {"  ", "column 1: there is no atom"},
      {"[CH4", "column 1: '[' is never closed"},
      {"C[]", "column 3: no element symbol after '['"},
      {"[Xx]", "column 2: no element symbol after '['"},
      {"[CH2-H]", "column 6: 'H' does not fit into a bracket atom"},
      {"[C:]", "column 3: ':' needs an atom class"},
      {"[C+16]", "column 3: a charge is at most 15"},
      {"[1000C]", "column 2: an isotope has at most three digits"},
      {"[C@TH3]", "column 3: the chirality @TH goes from 1 to 2"},
      {"[HH]", "column 1: a hydrogen atom cannot bear hydrogens"},
      {"CQ", "column 2: 'Q' is no atom"},
      {"C\xC3\xA9", "column 2: the byte 0xC3 is no part of a SMILES"},
      {"C C", "column 2: a blank ends the SMILES, but more text follows"},
      {"C(C)(C)(C)(C)C", "column 1: C1 has 5 bonds; C with charge +0 forms at most 4"},
      {"CN(C)(C)C", "column 2: N2 has 4 bonds; N with charge +0 forms at most 3"},
      {"FC=F", "column 4: F3 has 2 bonds"},
      {"cc", "column 1: an aromatic atom stands outside a ring"},
      {"c1cccc1", "no Kekule structure"},
      {"c1ccnc1", "a ring nitrogen that bears a hydrogen (N4?) is written [nH]"},
      {"c1cc2cccc3cccc(c1)c23", "no Kekule structure"},
  };
  for (size_t i = 0; i < sizeof bad / sizeof *bad; i++) {
    mho_error error;
    assert_int_equal(read_error(bad[i].text, &error), MHO_ERR_SYNTAX);
    if (!strstr(error.cause[0].message, bad[i].message))
      fail_msg("%s: %s", bad[i].text, error.cause[0].message);
  }
}

static void an_error_stands_where_the_text_stands(void **state)
{
  (void)state;
  mho_graph graph;
  mho_error error;
  mho_graph_init(&graph);
  mho_error_init(&error);
  mho_place place = {"m.yaml", 12, 10, false};
  assert_int_equal(mho_smiles_read("c1ccc(", &place, &graph, &error), MHO_ERR_SYNTAX);
  char line[200];
  mho_cause_format(&error.cause[0], line, sizeof line);
  assert_string_equal(line, "m.yaml:12:15: column 6: '(' is never closed");
  assert_int_equal(mho_smiles_read("c1ccc(", NULL, &graph, NULL), MHO_ERR_SYNTAX);
}

static void the_grammar_is_read_whole(void **state)
{
  (void)state;
  static const struct {
    const char *text, *formula;
    int rings, parts;
  } good[] = {
      {" CCO\r\n", "C2H6O", 0, 1},
      {"[235U].[2H]O[2H]", "H2OU", 0, 2},
      {"C1.C1", "C2H6", 0, 1},
      {"C%99CCCC%99", "C5H10", 1, 1},
      {"C1CC1C1CC1", "C6H10", 2, 1},
      {"C=1CC1", "C3H4", 1, 1},
      {"C1CC=1", "C3H4", 1, 1},
      {"F/C=C/F", "C2H2F2", 0, 1},
      {"C/1=C/CCCC1", "C6H10", 1, 1},
      {"N[C@@H](C)C(=O)O", "C3H7NO2", 0, 1},
      {"[Co@OH12](Cl)(Cl)(Cl)(Cl)(Cl)Cl", "Cl6Co", 0, 1},
      {"[C@TH1](F)(Cl)(Br)I", "CBrClFI", 0, 1},
      {"OC(=O)[C@AL2H]C", "C3H5O2", 0, 1},
      {"C(.C)C", "C3H10", 0, 2},
      {"C(=O)(.O)N", "CH5NO2", 0, 2},
      {"[Fe++]", "Fe+2", 0, 1},
      {"[O--]", "O-2", 0, 1},
      {"C$C", "C2", 0, 1},
      {"*C", "CH3*", 0, 1},
      {"[CH4:123]", "CH4", 0, 1},
      {"B", "BH3", 0, 1},
      {"N(=O)(=O)C", "CH3NO2", 0, 1},
      {"CS(=O)(=O)C", "C2H6O2S", 0, 1},
      {"CSC", "C2H6S", 0, 1},
      {"P(Cl)(Cl)(Cl)(Cl)Cl", "Cl5P", 0, 1},
      {"C:1:C:C:C:C:C:1", "C6H6", 1, 1},
      {"c1ccc-2c(c1)-c1ccccc1-2", "C12H8", 3, 1},
      {"c1ccccc1c1ccccc1", "C12H10", 2, 1},
      {"[nH]1cccc1", "C4H5N", 1, 1},
      {"O=n1ccccc1", "C5H5NO", 1, 1},
      {"[te]1cccc1", "C4H4Te", 1, 1},
      {"C(C)1CCC1", "C5H10", 1, 1},
      {"c1ccNc1", "C4H5N", 1, 1}, /* pyrrole, nothing saturated */
  };
  for (size_t i = 0; i < sizeof good / sizeof *good; i++) {
    mho_graph graph;
    mho_error error;
    char formula[64];
    mho_graph_init(&graph);
    mho_error_init(&error);
    if (mho_smiles_read(good[i].text, NULL, &graph, &error) != MHO_OK)
      fail_msg("%s: %s", good[i].text, error.cause[0].message);
    mho_graph_formula(&graph, formula, sizeof formula);
    if (strcmp(formula, good[i].formula)) fail_msg("%s: %s", good[i].text, formula);
    assert_int_equal(mho_graph_rings(&graph), good[i].rings);
    assert_int_equal(mho_graph_parts(&graph), good[i].parts);
    mho_graph_clear(&graph);
  }
}

static void an_atom_keeps_what_its_bracket_says(void **state)
{
  (void)state;
  mho_graph graph;
  mho_graph_init(&graph);
  assert_int_equal(mho_smiles_read("C[13CH-:7]c1ccccc1", NULL, &graph, NULL), MHO_OK);
  const mho_graph_atom *atom = &graph.atom[1];
  assert_int_equal(atom->isotope, 13);
  assert_int_equal(atom->charge, -1);
  assert_int_equal(atom->hydrogens, 1);
  assert_int_equal(atom->atom_class, 7);
  assert_int_equal(atom->radical, 0);
  assert_int_equal(atom->column, 2);
  assert_true(atom->bracket && !atom->aromatic && graph.atom[2].aromatic);
  char name[16];
  mho_graph_atom_name(&graph, 4, name, sizeof name);
  assert_string_equal(name, "C5");
  for (int b = 0; b < graph.bond_count; b++)
    assert_int_equal(graph.bond[b].ring, b >= 2);
  mho_graph_clear(&graph);
}

/* text repeated, between a head and a tail; the caller frees it. */
static char *repeat(const char *head, const char *text, int count, const char *tail)
{
  size_t size = strlen(text);
  char *all = malloc(strlen(head) + (size_t)count * size + strlen(tail) + 1);
  assert_non_null(all);
  char *at = stpcpy(all, head);
  for (int i = 0; i < count; i++) at = stpcpy(at, text);
  strcpy(at, tail);
  return all;
}

static void size_and_depth_are_bounded(void **state)
{
  (void)state;
  static const struct {
    const char *head, *text;
    int count;
    const char *tail;
    mho_status status;
  } large[] = {
      {"", "C", MHO_ATOM_LIMIT, "", MHO_OK},
      {"", "C", MHO_ATOM_LIMIT + 1, "", MHO_ERR_LIMIT},
      {"", "C(", MHO_ATOM_LIMIT - 1, "C", MHO_ERR_SYNTAX},
      {"", "C", MHO_SMILES_LIMIT + 1, "", MHO_ERR_LIMIT},
      {"", "[13CH3]", MHO_SMILES_LIMIT, "", MHO_ERR_LIMIT},
      {"C", "(", MHO_SMILES_LIMIT - 1, "", MHO_ERR_SYNTAX},
      {"C", "1", MHO_SMILES_LIMIT - 1, "", MHO_ERR_SYNTAX},
      {"c1", "c", MHO_ATOM_LIMIT - 2, "c1", MHO_OK},
      {"c1", "c", MHO_ATOM_LIMIT - 3, "c1", MHO_ERR_SYNTAX}, /* odd ring */
      {"", "c1ccc(cc1)", 1600, "C", MHO_OK},
  };
  for (size_t i = 0; i < sizeof large / sizeof *large; i++) {
    char *text = repeat(large[i].head, large[i].text, large[i].count, large[i].tail);
    mho_error error;
    assert_int_equal(read_error(text, &error), large[i].status);
    free(text);
  }
}

/* Usual valences as OpenSMILES 1.0 tells them, and ions by the octet. */
static void valences_follow_the_octet(void **state)
{
  (void)state;
  static const struct {
    int element, charge, used, valence;
  } table[] = {
      {ELEMENT_C, 0, 2, 4}, {ELEMENT_C, 0, 5, -1}, {ELEMENT_N, 0, 3, 3}, {ELEMENT_N, 0, 4, 5},
      {ELEMENT_N, 1, 0, 4}, {ELEMENT_N, -1, 0, 2}, {ELEMENT_O, 1, 0, 3}, {ELEMENT_O, -1, 0, 1},
      {ELEMENT_O, 0, 3, -1}, {ELEMENT_S, 0, 3, 4}, {ELEMENT_S, 0, 5, 6}, {ELEMENT_S, 1, 0, 3},
      {ELEMENT_P, 0, 4, 5}, {ELEMENT_B, 0, 0, 3}, {ELEMENT_B, -1, 0, 4}, {ELEMENT_C, 1, 0, 3},
      {ELEMENT_C, -1, 0, 3}, {ELEMENT_CL, 0, 0, 1}, {ELEMENT_CL, -1, 0, 0}, {ELEMENT_CL, 0, 6, 7},
      {ELEMENT_F, 0, 2, -1}, {ELEMENT_P, -1, 6, 6}, {ELEMENT_AU, 0, 3, 3}, {ELEMENT_H, 1, 0, 0},
  };
  for (size_t i = 0; i < sizeof table / sizeof *table; i++)
    assert_int_equal(mho_element_valence(table[i].element, table[i].charge, table[i].used),
                     table[i].valence);
}

int main(void)
{
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(an_error_gives_column_and_reason),
      cmocka_unit_test(an_error_stands_where_the_text_stands),
      cmocka_unit_test(the_grammar_is_read_whole),
      cmocka_unit_test(an_atom_keeps_what_its_bracket_says),
      cmocka_unit_test(size_and_depth_are_bounded),
      cmocka_unit_test(valences_follow_the_octet),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
