/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "check.h"

#include <mho/conductance.h>
#include <mho/structure.h>

#include <stdlib.h>

typedef struct {
  mho_molecule molecule;
  mho_structure structure;
  mho_error error;
} subject;

static mho_status read_subject(subject *s, const char *text,
                               const mho_structure_options *options)
{
  mho_molecule_init(&s->molecule);
  mho_structure_init(&s->structure);
  mho_error_init(&s->error);
  return mho_structure_read_smiles(text, options, &s->molecule, &s->structure, &s->error);
}

static void clear_subject(subject *s)
{
  mho_structure_clear(&s->structure);
  mho_molecule_clear(&s->molecule);
}

static mho_structure_options without_contacts(void)
{
  mho_structure_options options;
  mho_structure_options_init(&options);
  options.contacts_optional = true;
  return options;
}

/* `N1:N-pyrrole:2 C2:C:1 ...` */
static const char *rows_of(const mho_molecule *m, char *buffer, size_t size)
{
  size_t used = 0;
  buffer[0] = '\0';
  for (int i = 0; i < m->site_count; i++) {
    const char *row = mho_parameters_row_name(m->parameters, m->site[i].row);
    used += (size_t)snprintf(buffer + used, size - used, "%s%s:%s:%d", i ? " " : "",
                             m->site[i].id, row ? row : "-", m->site[i].electrons);
  }
  return buffer;
}

/* `C5-C8@34 C8-C9 C9-C10*0.9 ...`: twist of the rotatable, strength if not 1 */
static const char *bonds_of(const mho_molecule *m, char *buffer, size_t size)
{
  size_t used = 0;
  buffer[0] = '\0';
  for (int b = 0; b < m->bond_count; b++) {
    const mho_bond *bond = &m->bond[b];
    used += (size_t)snprintf(buffer + used, size - used, "%s%s-%s", b ? " " : "",
                             m->site[bond->site[0]].id, m->site[bond->site[1]].id);
    if (bond->strength != 1.0)
      used += (size_t)snprintf(buffer + used, size - used, "*%g", bond->strength);
    if (bond->rotatable)
      used += (size_t)snprintf(buffer + used, size - used, "@%g", bond->twist_deg);
  }
  return buffer;
}

static bool has_note(const subject *s, const char *part)
{
  for (int i = 0; i < s->structure.notes.count; i++)
    if (strstr(s->structure.notes.text[i], part)) return true;
  return false;
}

/* --- the first minute ---------------------------------------------------- */

static const char *const phenyls[] = {
    "Nc1ccc(N)cc1", "Nc1ccc(cc1)-c1ccc(N)cc1", "Nc1ccc(cc1)-c1ccc(cc1)-c1ccc(N)cc1"};

/* Sites, rows, bonds, twists and couplings that the defaults of the design
 * rest on: 34 deg between the rings, Gamma 1 eV. */
static void oligophenyl_diamines_are_what_the_defaults_say(void **state)
{
  (void)state;
  static const char *const rows[] = {
      "N1:N-pyrrole:2 C2:C:1 C3:C:1 C4:C:1 C5:C:1 N6:N-pyrrole:2 C7:C:1 C8:C:1",
      "N1:N-pyrrole:2 C2:C:1 C3:C:1 C4:C:1 C5:C:1 C6:C:1 C7:C:1 C8:C:1 C9:C:1 C10:C:1 C11:C:1 "
      "N12:N-pyrrole:2 C13:C:1 C14:C:1",
      "N1:N-pyrrole:2 C2:C:1 C3:C:1 C4:C:1 C5:C:1 C6:C:1 C7:C:1 C8:C:1 C9:C:1 C10:C:1 C11:C:1 "
      "C12:C:1 C13:C:1 C14:C:1 C15:C:1 C16:C:1 C17:C:1 N18:N-pyrrole:2 C19:C:1 C20:C:1"};
  static const char *const bonds[] = {
      "N1-C2 C2-C3 C3-C4 C4-C5 C5-N6 C5-C7 C7-C8 C2-C8",
      "N1-C2 C2-C3 C3-C4 C4-C5 C5-C6 C6-C7 C2-C7 C5-C8@34 C8-C9 C9-C10 C10-C11 C11-N12 C11-C13 "
      "C13-C14 C8-C14",
      "N1-C2 C2-C3 C3-C4 C4-C5 C5-C6 C6-C7 C2-C7 C5-C8@34 C8-C9 C9-C10 C10-C11 C11-C12 C12-C13 "
      "C8-C13 C11-C14@34 C14-C15 C15-C16 C16-C17 C17-N18 C17-C19 C19-C20 C14-C20"};
  for (int rings = 1; rings <= 3; rings++) {
    subject s;
    char text[1000];
    assert_int_equal(read_subject(&s, phenyls[rings - 1], NULL), MHO_OK);
    assert_string_equal(rows_of(&s.molecule, text, sizeof text), rows[rings - 1]);
    assert_string_equal(bonds_of(&s.molecule, text, sizeof text), bonds[rings - 1]);
    assert_string_equal(s.molecule.name, phenyls[rings - 1]);
    assert_int_equal(s.molecule.electrons, 6 * rings + 4);
    assert_int_equal(s.molecule.charge, 0);
    for (int side = 0; side < 2; side++) {
      assert_int_equal(s.molecule.contact[side].count, 1);
      assert_near(s.molecule.contact[side].coupling_ev, 1.0, 0);
    }
    assert_string_equal(s.molecule.site[s.molecule.contact[MHO_LEFT].site[0]].id, "N1");
    clear_subject(&s);
  }
}

/* Measured: 6.4e-3, 1.16e-3, 1.8e-4 G0 (L. Venkataraman et al., Nature 442,
 * 904 (2006) and papers of the same group; the first also S. Y. Quek et al.,
 * arXiv 0707.2091).  Computed apart from this program: 6.9e-3, 1.04e-3,
 * 1.75e-4. */
static void their_conductance_is_near_the_measured_one(void **state)
{
  (void)state;
  static const double measured[] = {6.4e-3, 1.16e-3, 1.8e-4};
  static const double computed[] = {6.9e-3, 1.04e-3, 1.75e-4};
  for (int i = 0; i < 3; i++) {
    subject s;
    mho_junction junction;
    mho_plan *plan;
    mho_conductance result;
    mho_conductance_options options = mho_conductance_defaults();
    assert_int_equal(read_subject(&s, phenyls[i], NULL), MHO_OK);
    assert_int_equal(mho_junction_build(&s.molecule, &junction, NULL), MHO_OK);
    assert_int_equal(mho_plan_create(&junction, &plan, NULL), MHO_OK);
    assert_int_equal(mho_conductance_compute(plan, 0.0, 300.0, &options, &result, NULL), MHO_OK);
    assert_close(result.conductance_g0, measured[i], 0.4);
    assert_close(result.conductance_g0, computed[i], 0.02);
    mho_plan_free(plan);
    mho_junction_clear(&junction);
    clear_subject(&s);
  }
}

/* --- rows and electrons -------------------------------------------------- */

static void each_bonding_situation_has_its_row(void **state)
{
  (void)state;
  static const struct {
    const char *smiles, *rows;
  } table[] = {
      {"c1ccncc1", "C1:C:1 C2:C:1 C3:C:1 N4:N-pyridine:1 C5:C:1 C6:C:1"},
      {"c1cc[nH]c1", "C1:C:1 C2:C:1 C3:C:1 N4:N-pyrrole:2 C5:C:1"},
      {"C=CO", "C1:C:1 C2:C:1 O3:O-furan:2"},
      {"C=CC=O", "C1:C:1 C2:C:1 C3:C:1 O4:O-carbonyl:1"},
      {"CC(N)=O", "C2:C:1 N3:N-pyrrole:2 O4:O-carbonyl:1"},
      {"c1ccsc1", "C1:C:1 C2:C:1 C3:C:1 S4:S-thiophene:2 C5:C:1"},
      {"C=S", "C1:C:1 S2:S-thione:1"},
      {"C=CSC", "C1:C:1 C2:C:1 S3:S-thiophene:2"},
      {"C=CS", "C1:C:1 C2:C:1 S3:S-thiophene:2"},
      {"C=C[S-]", "C1:C:1 C2:C:1 S3:S-thiophene:2"},
      {"C=CSC(C)=O", "C1:C:1 C2:C:1 S3:S-thiophene:2"},
      {"C=C[S]", "C1:C:1 C2:C:1 S3:S-thiophene:2"},
      {"[Au]SC=C", "S2:S-thiophene:2 C3:C:1 C4:C:1"},
      {"CC#N", "C2:C:1 N3:N-pyridine:1"},
      {"C=C[N+]#[C-]", "C1:C:1 C2:C:1 N3:N-pyridine:1 C4:C:1"},
      {"C=C[N+](=O)[O-]", "C1:C:1 C2:C:1 N3:N-pyrrole:2 O4:O-carbonyl:1 O5:O-carbonyl:1"},
      {"C=CN(=O)=O", "C1:C:1 C2:C:1 N3:N-pyrrole:2 O4:O-carbonyl:1 O5:O-carbonyl:1"},
      {"C=NC=C", "C1:C:1 N2:N-pyridine:1 C3:C:1 C4:C:1"},
      {"C=CF", "C1:C:1 C2:C:1 F3:F:2"},
      {"C=CCl", "C1:C:1 C2:C:1 Cl3:Cl:2"},
      {"C=CB(C)C", "C1:C:1 C2:C:1 B3:B:0"},
      {"C=[SiH2]", "C1:C:1 Si2:Si:1"},
      {"C=P", "C1:C:1 P2:P-pyridine:1"},
      {"C=CP(C)C", "C1:C:1 C2:C:1 P3:P-pyrrole:2"},
      {"C=C[CH2+]", "C1:C:1 C2:C:1 C3:C:0"},
      {"C=C[CH2-]", "C1:C:1 C2:C:1 C3:C:2"},
      {"C=C[CH2]", "C1:C:1 C2:C:1 C3:C:1"},
      {"C=C[O]", "C1:C:1 C2:C:1 O3:O-carbonyl:1"},
      {"C=CNN", "C1:C:1 C2:C:1 N3:N-pyrrole:2 N4:N-pyrrole:2"},
      {"C=CC[NH3+]", "C1:C:1 C2:C:1"},
      {"C=CC(F)(F)F", "C1:C:1 C2:C:1"},
      {"C=CCS(C)(=O)=O", "C1:C:1 C2:C:1"},
      {"C#CC=C", "C1:C:1 C2:C:1 C3:C:1 C4:C:1"},
      {"C=C=C=C", "C1:C:1 C2:C:1 C3:C:1 C4:C:1"},
      {"C=C=C", "C1:C:1 C2:C:1 C2b:C:1 C3:C:1"},
      {"C=C=O", "C1:C:1 C2:C:1 C2b:C:1 O3:O-carbonyl:1"},
      {"F[B-](F)(F)C=C", "C5:C:1 C6:C:1"},
      {"[O-][n+]1ccccc1", "O1:O-carbonyl:1 N2:N-pyrrole:2 C3:C:1 C4:C:1 C5:C:1 C6:C:1 C7:C:1"},
  };
  mho_structure_options options = without_contacts();
  for (size_t i = 0; i < sizeof table / sizeof *table; i++) {
    subject s;
    char text[400];
    if (read_subject(&s, table[i].smiles, &options) != MHO_OK)
      fail_msg("%s: %s", table[i].smiles, s.error.cause[0].message);
    rows_of(&s.molecule, text, sizeof text);
    if (strcmp(text, table[i].rows)) fail_msg("%s: %s", table[i].smiles, text);
    clear_subject(&s);
  }
}

static void what_has_no_source_is_refused_by_name_and_column(void **state)
{
  (void)state;
  static const struct {
    const char *smiles, *message;
  } table[] = {
      {"C[n+]1ccccc1", "column 2: N2 needs the row 'N+'"},
      {"CC=[NH2+]", "column 4: N3 needs the row 'N+'"},
      {"[O-]c1ccccc1", "column 1: O1 needs the row 'O-'"},
      {"c1cc[o+]cc1", "column 5: O4 needs the row 'O+'"},
      {"Brc1ccccc1", "column 1: Br1 needs the row 'Br'"},
      {"c1cc[se]c1", "column 5: Se4 needs the row 'Se'"},
      {"CS(=O)(=O)c1ccccc1", "column 2: S2 is a sulfur with more than two bonds"},
      {"*c1ccccc1", "column 1: *1 is the wildcard"},
      {"CP(C)(=O)C=C", "column 2: P2 is a phosphorus with five bonds"},
  };
  mho_structure_options options = without_contacts();
  for (size_t i = 0; i < sizeof table / sizeof *table; i++) {
    subject s;
    assert_int_equal(read_subject(&s, table[i].smiles, &options), MHO_ERR_UNPARAMETERISED);
    if (!strstr(s.error.cause[0].message, table[i].message))
      fail_msg("%s: %s", table[i].smiles, s.error.cause[0].message);
    clear_subject(&s);
  }
  subject s;
  assert_int_equal(read_subject(&s, "CCO", &options), MHO_ERR_RANGE);
  clear_subject(&s);
}

/* Levels in units of beta against the closed forms and tables of Hueckel
 * theory (k = 1 everywhere), heteroatoms with Van-Catledge's parameters;
 * computed apart from this program. */
static void levels_are_those_of_the_books(void **state)
{
  (void)state;
  static const struct {
    const char *smiles;
    int count;
    double x[10];
  } table[] = {
      {"C=CC=C", 4, {1.6180, 0.6180, -0.6180, -1.6180}},
      {"C=C1C=CC=C1", 6, {2.1149, 1, 0.6180, -0.2541, -1.6180, -1.8608}},
      {"c1ccc(C=C)cc1", 8, {2.1358, 1.4142, 1, 0.6622, -0.6622, -1, -1.4142, -2.1358}},
      {"c1ccc2cccc-2cc1", 10,
       {2.3103, 1.6516, 1.3557, 0.8870, 0.4773, -0.4004, -0.7376, -1.5792, -1.8692, -2.0953}},
      {"c1ccoc1", 5, {2.5480, 1.3826, 0.6180, -0.8406, -1.6180}},
      {"c1ccsc1", 5, {2.0222, 1.0547, 0.6180, -0.9669, -1.6180}},
      {"C=O", 2, {1.6507, -0.6807}},
  };
  mho_structure_options options = without_contacts();
  options.alternation = MHO_ALTERNATION_NONE;
  for (size_t i = 0; i < sizeof table / sizeof *table; i++) {
    subject s;
    mho_junction junction;
    assert_int_equal(read_subject(&s, table[i].smiles, &options), MHO_OK);
    assert_int_equal(mho_junction_build(&s.molecule, &junction, NULL), MHO_OK);
    assert_int_equal(junction.sites, table[i].count);
    for (int k = 0; k < junction.sites; k++)
      assert_near(junction.level_ev[k] / MHO_DEFAULT_BETA_EV, table[i].x[k], 6e-5);
    mho_junction_clear(&junction);
    clear_subject(&s);
  }
}

/* --- linkers and contacts ------------------------------------------------ */

static void linkers_are_found_and_chains_are_not(void **state)
{
  (void)state;
  static const struct {
    const char *smiles, *linkers;
  } table[] = {
      {"Sc1ccccc1", "thiol 1"},
      {"[S-]c1ccccc1", "thiolate 1"},
      {"CC(=O)Sc1ccccc1", "thioacetate 4"},
      {"CSc1ccccc1", "thioether 2"},
      {"CCCSc1ccc(SC(C)C)cc1", "thioether 4 thioether 9"},
      {"c1ccccc1Sc1ccccc1", ""},
      {"c1ccccc1SCCSc1ccccc1", ""},
      {"c1ccsc1", ""},
      {"C1CSc2ccccc21", ""},
      {"CC(=S)c1ccccc1", ""},
      {"N#CSc1ccccc1", "nitrile 1"},
      {"Nc1ccccc1", "amine 1"},
      {"CNc1ccccc1", "amine 2"},
      {"CN(C)c1ccccc1", ""},
      {"c1ccccc1Nc1ccccc1", ""},
      {"CC(=O)Nc1ccccc1", ""},
      {"NC(=O)c1ccccc1", ""},
      {"[NH3+]c1ccccc1", ""},
      {"NCc1ccccc1", "amine 1"},
      {"C1CNc2ccccc21", ""},
      {"c1ccncc1", "pyridine 4"},
      {"C[n+]1ccccc1", ""},
      {"c1cc[nH]c1", ""},
      {"N#Cc1ccccc1", "nitrile 1"},
      {"[C-]#[N+]c1ccccc1", "isonitrile 1"},
      {"OC(=O)c1ccccc1", "carboxyl 1"},
      {"[O-]C(=O)c1ccccc1", "carboxyl 1"},
      {"COC(=O)c1ccccc1", ""},
      {"O=[N+]([O-])c1ccccc1", "nitro 1"},
      {"O=N(=O)c1ccccc1", "nitro 1"},
      {"C#Cc1ccccc1", "ethynyl 1"},
      {"CC#Cc1ccccc1", ""},
      {"[Au]c1ccccc1", "gold-carbon 2"},
      {"[Au]Sc1ccccc1", "thiol 2"},
      {"[H]N([H])c1ccccc1", "amine 2"},
      {"Oc1ccccc1", ""},
  };
  mho_structure_options options = without_contacts();
  for (size_t i = 0; i < sizeof table / sizeof *table; i++) {
    subject s;
    char text[200] = "";
    size_t used = 0;
    mho_status status = read_subject(&s, table[i].smiles, &options);
    assert_true(status == MHO_OK || status == MHO_ERR_UNPARAMETERISED);
    for (int k = 0; k < s.structure.linker_count; k++)
      used += (size_t)snprintf(text + used, sizeof text - used, "%s%s %d", k ? " " : "",
                               mho_linker_name(s.structure.linker[k].kind),
                               s.structure.linker[k].atom[0] + 1);
    if (strcmp(text, table[i].linkers)) fail_msg("%s: %s", table[i].smiles, text);
    clear_subject(&s);
  }
}

static void contacts_follow_classes_then_precedence(void **state)
{
  (void)state;
  static const struct {
    const char *smiles, *left, *right;
    double coupling_ev[2];
  } table[] = {
      {"[CH:1]1=CC=[CH:2]C=C1", "C1", "C4", {0.5, 0.5}},
      {"[SH:2]c1ccc([NH2:1])cc1", "N6", "S1", {1.0, 1.0}},
      {"Nc1ccc(-c2ccncc2)cc1", "N1", "N9", {1.0, 0.3}},
      /* Two terminal linkers: the ring nitrogen does not count. */
      {"Nc1ccc(-c2cnc(N)cc2)cc1", "N1", "N10", {1.0, 1.0}},
      {"n1ccc(cc1)-c1ccncc1", "N1", "N10", {0.3, 0.3}},
      {"N#Cc1ccc(SC)cc1", "N1", "S7", {0.3, 1.0}},
      {"[O-]C(=O)c1ccc(N)cc1", "O1 O3", "N8", {0.5, 1.0}},
      {"[cH:1]1[cH:1]ccc[cH:2]1", "C1 C2", "C6", {0.5, 0.5}},
      {"[Au]c1ccc([Au])cc1", "C2", "C5", {0.5, 0.5}},
      {"[S-]c1ccc([S-])cc1.[Na+].[Na+]", "S1", "S6", {1.0, 1.0}},
  };
  for (size_t i = 0; i < sizeof table / sizeof *table; i++) {
    subject s;
    if (read_subject(&s, table[i].smiles, NULL) != MHO_OK)
      fail_msg("%s: %s", table[i].smiles, s.error.cause[0].message);
    for (int side = 0; side < 2; side++) {
      char text[100] = "";
      const mho_contact *c = &s.molecule.contact[side];
      for (int k = 0; k < c->count; k++)
        snprintf(text + strlen(text), sizeof text - strlen(text), "%s%s", k ? " " : "",
                 s.molecule.site[c->site[k]].id);
      assert_string_equal(text, side ? table[i].right : table[i].left);
      assert_near(c->coupling_ev, table[i].coupling_ev[side], 0);
    }
    clear_subject(&s);
  }
}

static void contacts_that_cannot_be_are_errors(void **state)
{
  (void)state;
  static const struct {
    const char *smiles, *message;
  } table[] = {
      {"c1ccccc1", "found: none"},
      {"Nc1cc(N)cc(N)c1", "found: amine N1, amine N5, amine N8"},
      {"Nc1ccc([N+](=O)[O-])c(N)c1", "found: amine N1, nitro O7+O8, amine N10"},
      {"n1ccncc1CN", "found: pyridine N1, pyridine N4, amine N8"},
      {"[NH2:1]c1ccc(N)cc1", "no atom has class 2"},
      {"[NH2:2]c1ccc(N)cc1", "no atom has class 1"},
      {"[NH2:1]c1ccc([NH2:3])cc1", "atom class 3"},
      {"[CH3:1]c1ccc([NH2:2])cc1", "column 1: the left contact C1 carries no p orbital"},
  };
  for (size_t i = 0; i < sizeof table / sizeof *table; i++) {
    subject s;
    assert_int_equal(read_subject(&s, table[i].smiles, NULL), MHO_ERR_CONTACTS);
    if (!strstr(s.error.cause[0].message, table[i].message))
      fail_msg("%s: %s", table[i].smiles, s.error.cause[0].message);
    clear_subject(&s);
  }
  subject s;
  mho_structure_options options = without_contacts();
  assert_int_equal(read_subject(&s, "Nc1cc(N)cc(N)c1", &options), MHO_OK);
  assert_int_equal(s.molecule.contact[MHO_LEFT].count, 0);
  assert_true(has_note(&s, "no contacts"));
  clear_subject(&s);
}

static void warnings_tell_a_broken_path(void **state)
{
  (void)state;
  static const struct {
    const char *smiles;
    mho_alternation alternation;
    unsigned warnings;
  } table[] = {
      {"SCc1ccc(CS)cc1", MHO_ALTERNATION_FORMAL, MHO_WARN_NO_PI_PATH | MHO_WARN_DIFFERENT_FRAGMENTS},
      {"NC=C=CN", MHO_ALTERNATION_FORMAL, MHO_WARN_NO_PI_PATH | MHO_WARN_DIFFERENT_FRAGMENTS},
      {"NC=C=C=CN", MHO_ALTERNATION_FORMAL, 0},
      {"NC=C=C=CN", MHO_ALTERNATION_NONE, MHO_WARN_UNIFORM_BONDS},
      {"Nc1ccc(N)cc1", MHO_ALTERNATION_NONE, 0},
      {"Nc1ccc(N)cc1.[Zn]", MHO_ALTERNATION_NONE, MHO_WARN_METAL},
      {"[Au]Sc1ccc(S[Au])cc1", MHO_ALTERNATION_FORMAL, 0},
  };
  for (size_t i = 0; i < sizeof table / sizeof *table; i++) {
    subject s;
    mho_structure_options options;
    mho_structure_options_init(&options);
    options.alternation = table[i].alternation;
    assert_int_equal(read_subject(&s, table[i].smiles, &options), MHO_OK);
    if (s.structure.warnings != table[i].warnings)
      fail_msg("%s: warnings %x", table[i].smiles, s.structure.warnings);
    clear_subject(&s);
  }
}

/* --- bonds --------------------------------------------------------------- */

static void alternation_and_twists(void **state)
{
  (void)state;
  static const struct {
    const char *smiles, *bonds;
  } table[] = {
      {"C=CC=C", "C1-C2*1.1 C2-C3*0.9@0 C3-C4*1.1"},
      {"C=C[CH2]", "C1-C2 C2-C3"},
      {"C=CC=C[CH2+]", "C1-C2 C2-C3 C3-C4 C4-C5"},
      {"C=CC(=C)C=C", "C1-C2*1.1 C2-C3*0.9@0 C3-C4*1.1 C3-C5*0.9@0 C5-C6*1.1"},
      {"C=C=C=C", "C1-C2*1.1 C2-C3*0.9@0 C3-C4*1.1"},
      {"C#CC#CC=C", "C1-C2*1.1 C2-C3*0.9 C3-C4*1.1 C4-C5*0.9@0 C5-C6*1.1"},
      {"C1=CC=CC1=C", "C1-C2 C2-C3 C3-C4 C4-C5 C1-C5 C5-C6*1.1"},
      {"NC=O", "N1-C2 C2-O3"}, /* one atom has no plane of its own */
      {"C=CN=O", "C1-C2*1.1 C2-N3@0 N3-O4"},
  };
  mho_structure_options options = without_contacts();
  for (size_t i = 0; i < sizeof table / sizeof *table; i++) {
    subject s;
    char text[400];
    assert_int_equal(read_subject(&s, table[i].smiles, &options), MHO_OK);
    bonds_of(&s.molecule, text, sizeof text);
    if (strcmp(text, table[i].bonds)) fail_msg("%s: %s", table[i].smiles, text);
    clear_subject(&s);
  }
}

/* Angles of the rotatable bonds, in order; sources beside the table of
 * torsion.c. */
static void twists_follow_the_ortho_positions(void **state)
{
  (void)state;
  static const struct {
    const char *smiles, *angles;
  } table[] = {
      {"c1ccccc1-c1ccccc1", "34"},
      {"c1ccccc1c1ccccc1", "34"},
      {"C1=CC=CC=C1C1=CC=CC=C1", "34"},
      {"Cc1ccccc1-c1ccccc1", "55"},
      {"Cc1ccccc1-c1ccccc1C", "70"},
      {"Cc1cccc(C)c1-c1c(C)cccc1C", "88"},
      {"Fc1ccccc1-c1ccccc1", "50"},
      {"c1ccc2c(c1)cccc2-c1ccccc1", "55"},
      {"n1ccccc1-c1ccccn1", "0"},
      {"n1ccccc1-c1ccccc1", "20"},
      {"n1ccc(cc1)-c1ccncc1", "34"},
      {"s1cccc1-c1cccs1", "33"},
      {"s1cccc1-c1ccccc1", "28"},
      {"c1ccccc1C=Cc1ccccc1", "0 0"},
      {"c1ccccc1N=Nc1ccccc1", "0 0"},
      {"c1ccccc1C#Cc1ccccc1", "0 0"},
      {"c1ccccc1Nc1ccccc1", "0 0"},
      {"C1c2ccccc2-c2ccccc12", ""}, /* one ring */
      {"N#Cc1ccccc1", ""},
      {"C#Cc1ccccc1", ""},
      {"COc1ccccc1", ""},
      {"c1ccccc1-c1ccccc1-c1ccccc1", "55 55"},
  };
  mho_structure_options options = without_contacts();
  for (size_t i = 0; i < sizeof table / sizeof *table; i++) {
    subject s;
    char text[100] = "";
    assert_int_equal(read_subject(&s, table[i].smiles, &options), MHO_OK);
    for (int b = 0; b < s.molecule.bond_count; b++)
      if (s.molecule.bond[b].rotatable)
        snprintf(text + strlen(text), sizeof text - strlen(text), "%s%g", *text ? " " : "",
                 s.molecule.bond[b].twist_deg);
    if (strcmp(text, table[i].angles)) fail_msg("%s: %s", table[i].smiles, text);
    clear_subject(&s);
  }
}

static void a_twist_can_be_set(void **state)
{
  (void)state;
  mho_twist_setting twist = {{"C8", "C5"}, 90.0};
  mho_structure_options options;
  mho_structure_options_init(&options);
  options.twist = &twist;
  options.twist_count = 1;
  subject s;
  assert_int_equal(read_subject(&s, phenyls[1], &options), MHO_OK);
  for (int b = 0; b < s.molecule.bond_count; b++)
    if (s.molecule.bond[b].rotatable) assert_near(mho_molecule_hopping_ev(&s.molecule, b), 0, 0);
  assert_false(has_note(&s, "estimate"));
  clear_subject(&s);
  twist.atom[1] = "C6";
  assert_int_equal(read_subject(&s, phenyls[1], &options), MHO_ERR_REFERENCE);
  assert_non_null(strstr(s.error.cause[0].message, "rotatable bonds: C5-C8"));
  clear_subject(&s);
}

/* --- options ------------------------------------------------------------- */

static void alkyl_groups_follow_the_option(void **state)
{
  (void)state;
  /* Toluene; h and k as in A. Streitwieser (1961), values from memory. */
  mho_structure_options options = without_contacts();
  subject s;
  assert_int_equal(read_subject(&s, "Cc1ccccc1", &options), MHO_OK);
  assert_int_equal(s.molecule.site_count, 6);
  assert_true(has_note(&s, "alkyl groups on the pi system (1) left out"));
  clear_subject(&s);
  options.alkyl = MHO_ALKYL_INDUCTIVE;
  assert_int_equal(read_subject(&s, "Cc1ccccc1", &options), MHO_OK);
  assert_near(mho_molecule_onsite_ev(&s.molecule, 0), -0.5 * -2.7, 1e-15);
  assert_near(mho_molecule_onsite_ev(&s.molecule, 1), 0, 0);
  assert_int_equal(s.molecule.electrons, 6);
  clear_subject(&s);
  options.alkyl = MHO_ALKYL_HETEROATOM;
  assert_int_equal(read_subject(&s, "Cc1ccccc1", &options), MHO_OK);
  int group = mho_molecule_find_site(&s.molecule, "C1");
  assert_int_equal(group, 6);
  assert_near(mho_molecule_onsite_ev(&s.molecule, group), 2.0 * -2.7, 1e-15);
  assert_near(mho_molecule_hopping_ev(&s.molecule, 6), 0.7 * -2.7, 1e-15);
  assert_int_equal(s.molecule.electrons, 8);
  assert_int_equal(s.structure.site_atom[group], 0);
  clear_subject(&s);
  assert_int_equal(read_subject(&s, "FC(F)(F)c1ccccc1", &options), MHO_OK);
  assert_int_equal(s.molecule.site_count, 6);
  clear_subject(&s);
}

static void charge_and_coupling_are_options(void **state)
{
  (void)state;
  mho_structure_options options;
  mho_structure_options_init(&options);
  options.charge = 1;
  options.coupling_ev = 0.2;
  subject s;
  assert_int_equal(read_subject(&s, phenyls[0], &options), MHO_OK);
  assert_int_equal(s.molecule.electrons, 9);
  assert_int_equal(s.molecule.charge, 1);
  assert_near(s.molecule.contact[MHO_RIGHT].coupling_ev, 0.2, 0);
  clear_subject(&s);
  options.charge = 11;
  assert_int_equal(read_subject(&s, phenyls[0], &options), MHO_ERR_RANGE);
  clear_subject(&s);
  options = without_contacts();
  assert_int_equal(read_subject(&s, "[cH+]1cccccc1", &options), MHO_OK);
  assert_int_equal(s.molecule.electrons, 6);
  assert_int_equal(s.molecule.charge, 1);
  clear_subject(&s);
  assert_int_equal(read_subject(&s, "[S-]c1ccccc1", &options), MHO_OK);
  assert_int_equal(s.molecule.charge, 0);
  assert_true(has_note(&s, "S1: counted as bound to the electrode"));
  clear_subject(&s);
}

static void streitwieser_says_where_a_rule_stands_in(void **state)
{
  (void)state;
  mho_structure_options options = without_contacts();
  options.parameters = mho_parameters_builtin("streitwieser");
  assert_non_null(options.parameters);
  subject s;
  assert_int_equal(read_subject(&s, "c1ccncc1", &options), MHO_OK);
  assert_near(mho_molecule_onsite_ev(&s.molecule, 3), 0.5 * -2.7, 1e-15);
  assert_near(mho_molecule_hopping_ev(&s.molecule, 2), 1.0 * -2.7, 1e-15);
  assert_false(has_note(&s, "product"));
  clear_subject(&s);
  assert_int_equal(read_subject(&s, "NN=C", &options), MHO_OK);
  assert_near(mho_molecule_hopping_ev(&s.molecule, 0), 0.8 * -2.7, 1e-15);
  assert_true(has_note(&s, "k of N-pyridine and N-pyrrole is 0.8, the product"));
  clear_subject(&s);
  assert_int_equal(read_subject(&s, "c1ccsc1", &options), MHO_ERR_UNPARAMETERISED);
  assert_non_null(strstr(s.error.cause[0].message, "S4 needs the row 'S-thiophene'"));
  clear_subject(&s);
}

/* A row of one's own, and no k for its pairs but carbon: invented numbers. */
static void a_set_of_ones_own_brings_charged_rows(void **state)
{
  (void)state;
  mho_parameter_set *set = mho_parameters_copy(mho_parameters_builtin("van-catledge"), "own",
                                               "this test");
  assert_non_null(set);
  assert_int_equal(mho_parameters_put_row(set, "N+", 2.0, 1, 0.9, NULL), MHO_OK);
  assert_int_equal(mho_parameters_put_k(set, "N+", "N-pyridine", 0.7, NULL), MHO_OK);
  assert_int_equal(mho_parameters_put_k(set, "N+", "Xx", 0.7, NULL), MHO_ERR_REFERENCE);
  assert_int_equal(mho_parameters_put_k(set, "N+", "C", NAN, NULL), MHO_ERR_RANGE);
  assert_int_equal(mho_parameters_put_row(set, "O-", 2.0, 3, 0.9, NULL), MHO_ERR_RANGE);
  mho_structure_options options = without_contacts();
  options.parameters = set;
  subject s;
  assert_int_equal(read_subject(&s, "C[n+]1ncccc1", &options), MHO_OK);
  assert_int_equal(s.molecule.electrons, 6);
  assert_int_equal(s.molecule.charge, 1);
  assert_near(mho_molecule_onsite_ev(&s.molecule, 0), 2.0 * -2.7, 1e-15);
  assert_near(mho_molecule_hopping_ev(&s.molecule, 0), 0.7 * -2.7, 1e-15);
  clear_subject(&s);
  assert_int_equal(read_subject(&s, "N[n+]1ccccc1", &options), MHO_OK);
  assert_true(has_note(&s, "k of N-pyrrole and N+ is 0.801"));
  clear_subject(&s);
  mho_parameters_free(set);
}

static void the_second_pi_system_is_named(void **state)
{
  (void)state;
  subject s;
  assert_int_equal(read_subject(&s, "Nc1ccc(cc1)C#Cc1ccc(N)cc1", NULL), MHO_OK);
  assert_true(has_note(&s, "the second pi system of C8-C9"));
  clear_subject(&s);
}

/* The two orthogonal systems of a polyyne are equal, and their T add up. */
static void two_systems_that_reach_both_contacts_add(void **state)
{
  (void)state;
  double transmission[2];
  static const char *const smiles[] = {"N#CC#CC#N", "N#C[C:1]#[C:2]C#N"};
  for (int i = 0; i < 2; i++) {
    subject s;
    mho_junction junction;
    mho_plan *plan;
    mho_point point;
    double energy = 0.3;
    assert_int_equal(read_subject(&s, smiles[i], NULL), MHO_OK);
    assert_int_equal(s.molecule.site_count, 12);
    assert_int_equal(s.molecule.electrons, 12);
    assert_int_equal(s.molecule.contact[MHO_LEFT].count, 2);
    assert_int_equal(mho_junction_build(&s.molecule, &junction, NULL), MHO_OK);
    assert_int_equal(mho_plan_create(&junction, &plan, NULL), MHO_OK);
    assert_int_equal(mho_transmission_sweep(plan, 1, &energy, &point, NULL), MHO_OK);
    transmission[0] = point.transmission;
    mho_plan_free(plan);
    /* One of the two systems alone. */
    for (int side = 0; side < 2; side++) s.molecule.contact[side].count = 1;
    mho_junction_clear(&junction);
    assert_int_equal(mho_junction_build(&s.molecule, &junction, NULL), MHO_OK);
    assert_int_equal(mho_plan_create(&junction, &plan, NULL), MHO_OK);
    assert_int_equal(mho_transmission_sweep(plan, 1, &energy, &point, NULL), MHO_OK);
    transmission[1] = point.transmission;
    assert_close(transmission[0], 2 * transmission[1], 1e-10);
    mho_plan_free(plan);
    mho_junction_clear(&junction);
    clear_subject(&s);
  }
  subject s; /* an aryl between them: one system only */
  assert_int_equal(read_subject(&s, "C#Cc1ccc(C#C)cc1", NULL), MHO_OK);
  assert_int_equal(s.molecule.site_count, 10);
  clear_subject(&s);
}

int main(void)
{
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(oligophenyl_diamines_are_what_the_defaults_say),
      cmocka_unit_test(their_conductance_is_near_the_measured_one),
      cmocka_unit_test(each_bonding_situation_has_its_row),
      cmocka_unit_test(what_has_no_source_is_refused_by_name_and_column),
      cmocka_unit_test(levels_are_those_of_the_books),
      cmocka_unit_test(linkers_are_found_and_chains_are_not),
      cmocka_unit_test(contacts_follow_classes_then_precedence),
      cmocka_unit_test(contacts_that_cannot_be_are_errors),
      cmocka_unit_test(warnings_tell_a_broken_path),
      cmocka_unit_test(alternation_and_twists),
      cmocka_unit_test(twists_follow_the_ortho_positions),
      cmocka_unit_test(a_twist_can_be_set),
      cmocka_unit_test(alkyl_groups_follow_the_option),
      cmocka_unit_test(charge_and_coupling_are_options),
      cmocka_unit_test(streitwieser_says_where_a_rule_stands_in),
      cmocka_unit_test(a_set_of_ones_own_brings_charged_rows),
      cmocka_unit_test(the_second_pi_system_is_named),
      cmocka_unit_test(two_systems_that_reach_both_contacts_add),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
