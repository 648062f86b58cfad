/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Files of structures: hand-made records after Dassault Systemes, CTfile
 * Formats (2020), and what is wrong with others.
 */
#include <mho/mho.h>

#include <stdlib.h>
#include <unistd.h>

#include "check.h"
#include "molecule/records.h"
#include "molecule/texts.h"

static char path[64];

static void put_file(const char *ending, const char *text)
{
  snprintf(path, sizeof path, "records-%d%s", (int)getpid(), ending);
  FILE *file = fopen(path, "wb");
  assert_non_null(file);
  assert_int_equal(fwrite(text, 1, strlen(text), file), strlen(text));
  fclose(file);
}

typedef struct {
  mho_graph graph;
  mho_error error;
  mho_texts notes;
  char name[64], formula[64];
} outcome;

/* The first record of a file with that text. */
static mho_status read_text(const char *ending, const char *text, outcome *o)
{
  mho_records *records;
  mho_record record;
  memset(o, 0, sizeof *o);
  mho_error_init(&o->error);
  put_file(ending, text);
  mho_status status = mho_records_open(path, &records, &o->error);
  if (status == MHO_OK) {
    status = mho_records_next(records, &o->graph, &record, &o->notes, &o->error);
    snprintf(o->name, sizeof o->name, "%s", record.name);
    if (status == MHO_OK) mho_graph_formula(&o->graph, o->formula, sizeof o->formula);
    mho_records_close(records);
  }
  remove(path);
  return status;
}

static void drop(outcome *o)
{
  mho_graph_clear(&o->graph);
  mho_texts_clear(&o->notes);
}

#define ATOM(symbol, rest) "    0.0000    0.0000    0.0000 " symbol rest "\n"
#define PLAIN " 0  0  0  0  0  0  0  0  0  0  0  0"
#define HEAD(counts) "name\n  program\n\n" counts "  0  0  0  0  0  0  0  0999 V2000\n"
#define END "M  END\n"

static void good_records(void **state)
{
  (void)state;
  static const struct {
    const char *ending, *text, *formula;
  } table[] = {
      {".mol", HEAD("  2  1") ATOM("C  ", PLAIN) ATOM("O  ", PLAIN) "  1  2  2  0\n" END, "CH2O"},
      /* short lines, no fields behind the symbol, blanks at the ends, CR LF */
      {".mol", "\n\n\n  2  1  0     0  0            999 V2000  \r\n"
               "    0.0000    0.0000    0.0000 C\r\n    1.0000    0.0000    0.0000 N  \r\n"
               "  1  2  3\r\nM  END\r\n", "CHN"},
      /* charge codes: 5 is -1, 3 is +1, 4 a doublet radical */
      {".mol", HEAD("  1  0") ATOM("O  ", " 0  5  0  0  0  0  0  0  0  0  0  0") END, "HO-"},
      {".mol", HEAD("  1  0") ATOM("N  ", " 0  3  0  0  0  0  0  0  0  0  0  0") END, "H4N+"},
      {".mol", HEAD("  1  0") ATOM("C  ", " 0  4  0  0  0  0  0  0  0  0  0  0") END, "CH3"},
      /* M  CHG replaces all codes; two on one line */
      {".mol", HEAD("  2  0") ATOM("O  ", " 0  5  0  0  0  0  0  0  0  0  0  0") ATOM("N  ", PLAIN)
               "M  CHG  1   2   1\n" END, "H6NO+"},
      {".mol", HEAD("  2  0") ATOM("S  ", PLAIN) ATOM("Na ", PLAIN) "M  CHG  2   1  -1   2   1\n" END, "HNaS"},
      {".mol", HEAD("  1  0") ATOM("C  ", PLAIN) "M  RAD  1   1   3\n" END, "CH2"},
      /* an explicit valence, and valence zero (15) */
      {".mol", HEAD("  1  0") ATOM("C  ", " 0  0  0  0  0  3  0  0  0  0  0  0") END, "CH3"},
      {".mol", HEAD("  1  0") ATOM("C  ", " 0  0  0  0  0 15  0  0  0  0  0  0") END, "C"},
      {".mol", HEAD("  1  0") ATOM("D  ", PLAIN) END, "H2"},
      /* wedges, an alias, an atom value, a skipped block, property blocks we
       * need not know */
      {".mol", HEAD("  2  1") ATOM("C  ", PLAIN) ATOM("F  ", PLAIN) "  1  2  1  1  0  0  0\n"
               "A    1\nMe\nS  SKP  1\nM  CHG nonsense\nM  STY  1   1 DAT\nM  ISO  1   1  13\n" END, "CH3F"},
      {".xyz", "3\nwater\nO 0 0 0.117\nH 0 0.757 -0.469\nH 0 -0.757 -0.469\n", "H2O"},
      {".xyz", "  2 \r\n\r\n6 0.0 0.0 0.0 0.1\r\n8 0 0 1.13\r\n\r\n", NULL}, /* CO: an open valence */
      {".xyz", "3\nHCN\nH 0 0 -1.064\nC 0 0 0\nN 0 0 1.156\n", "CHN"},
      {".xyz", "4\nHCCH\nH 0 0 -1.66\nC 0 0 -0.6\nC 0 0 0.6\nH 0 0 1.66", "C2H2"},
  };
  for (size_t i = 0; i < sizeof table / sizeof *table; i++) {
    outcome o;
    mho_status status = read_text(table[i].ending, table[i].text, &o);
    if (table[i].formula && status != MHO_OK)
      fail_msg("%s: %s", table[i].text, o.error.cause[0].message);
    if (table[i].formula) assert_string_equal(o.formula, table[i].formula);
    else assert_int_equal(status, MHO_ERR_SYNTAX);
    drop(&o);
  }
}

static void bad_records_tell_the_place(void **state)
{
  (void)state;
  static const struct {
    const char *ending, *text;
    long line, column;
    const char *part;
  } table[] = {
      {".mol", HEAD("  2  1") ATOM("C  ", PLAIN) ATOM("O  ", PLAIN) "  1  2  2  0\n", 7, 1, "M  END"},
      {".mol", HEAD("  2  1") ATOM("C  ", PLAIN), 5, 1, "ends in its atoms"},
      {".mol", HEAD("  1  0") ATOM("R# ", PLAIN) END, 5, 32, "leaves open"},
      {".mol", HEAD("  1  0") ATOM("Q  ", PLAIN) END, 5, 32, "query atom"},
      {".mol", HEAD("  1  0") ATOM("Xx ", PLAIN) END, 5, 32, "no element"},
      {".mol", HEAD("  1  0") "    0.0000    nan       0.0000 C  " PLAIN "\n" END, 5, 11, "coordinate"},
      {".mol", HEAD("  2  1") ATOM("C  ", PLAIN) ATOM("O  ", PLAIN) "  1  3  1  0\n" END, 7, 1, "atom 3"},
      {".mol", HEAD("  2  1") ATOM("C  ", PLAIN) ATOM("O  ", PLAIN) "  1  1  1  0\n" END, 7, 1, "itself"},
      {".mol", HEAD("  2  1") ATOM("C  ", PLAIN) ATOM("O  ", PLAIN) "  1  2  8  0\n" END, 7, 1, "type 8"},
      {".mol", HEAD("  2  2") ATOM("C  ", PLAIN) ATOM("O  ", PLAIN) "  1  2  1  0\n  2  1  1  0\n" END,
       1, 1, "bonded twice"},
      {".mol", HEAD("  2  1") ATOM("F  ", PLAIN) ATOM("O  ", PLAIN) "  1  2  2  0\n" END, 5, 32, "bonds"},
      {".mol", HEAD("  1  0") ATOM("C  ", PLAIN) "M  CHG  1   7   1\n" END, 6, 10, "atom 7"},
      {".mol", HEAD("  1  0") ATOM("C  ", PLAIN) "M  RGP  1   1   1\n" END, 6, 1, "R-groups"},
      {".mol", "only\n", 1, 1, "counts line"},
      {".mol", "\n\n\nabcdef V2000\n", 4, 1, "counts line"},
      {".mol", "", 1, 1, "empty"},
      {".mol", "\n\n\n  0  0  0     0  0            999 V3000\nM  V30 BEGIN CTAB\nM  V30 COUNTS 1 0 0 0 0\n"
               "M  V30 BEGIN ATOM\nM  V30 1 C 0 0 zero 0\n", 8, 16, "three coordinates"},
      {".xyz", "2\n\nC 0 0 0\nC 0 0 0.1\n", 4, 1, "apart"},
      {".xyz", "2\n\nC 0 0 0\n", 3, 1, "ends in its atoms"},
      {".xyz", "1\n\nC 0 0\n", 3, 6, "three coordinates"},
      {".xyz", "1\n\nC 0 0 0\n", 3, 1, "open valence"},
      {".xyz", "many\n", 1, 1, "number of its atoms"},
  };
  for (size_t i = 0; i < sizeof table / sizeof *table; i++) {
    outcome o;
    mho_status status = read_text(table[i].ending, table[i].text, &o);
    const mho_cause *cause = &o.error.cause[0];
    if (status == MHO_OK || o.graph.atom_count) fail_msg("accepted: %s", table[i].text);
    assert_true(mho_status_is_input(status));
    if (cause->line != table[i].line || cause->column != table[i].column || !strstr(cause->message, table[i].part))
      fail_msg("%s\n%ld:%ld: %s\nexpected %ld:%ld: ... %s", table[i].text, cause->line, cause->column,
               cause->message, table[i].line, table[i].column, table[i].part);
    drop(&o);
  }
}

/* The same ring with aromatic bonds (type 4) and in V3000 with its own
 * numbering and a continued line. */
static void aromatic_bonds_and_v3000(void **state)
{
  (void)state;
  outcome o;
  char text[2000] = HEAD("  6  6");
  for (int a = 0; a < 6; a++) strcat(text, ATOM("C  ", PLAIN));
  for (int b = 0; b < 6; b++)
    sprintf(text + strlen(text), "%3d%3d  4  0\n", b + 1, (b + 1) % 6 + 1);
  strcat(text, END);
  assert_int_equal(read_text(".mol", text, &o), MHO_OK);
  assert_string_equal(o.formula, "C6H6");
  assert_string_equal(o.name, "name");
  assert_null(o.graph.position); /* all at the origin: no coordinates */
  drop(&o);
  static const char v3000[] =
      "\xEF\xBB\xBFna\xC3\xAFve\n  program           3D\n\n  0  0  0     0  0            999 V3000\n"
      "M  V30 BEGIN CTAB\nM  V30 COUNTS 3 2 0 0 0\nM  V30 BEGIN ATOM\n"
      "M  V30 10 C 0 0 0 0\nM  V30 7 O 1.2 0 -\nM  V30 0 0 CHG=-1\nM  V30 3 O -1.2 0 0 2 CFG=1\n"
      "M  V30 END ATOM\nM  V30 BEGIN BOND\nM  V30 1 1 10 7\nM  V30 2 2 3 10\nM  V30 END BOND\n"
      "M  V30 BEGIN SGROUP\nM  V30 nothing\nM  V30 END SGROUP\nM  V30 END CTAB\nM  END\n";
  assert_int_equal(read_text(".sdf", v3000, &o), MHO_OK);
  assert_string_equal(o.formula, "CHO2-");
  assert_string_equal(o.name, "na\xC3\xAFve");
  assert_true(o.graph.is_3d);
  assert_near(o.graph.position[1][0], 1.2, 0);
  assert_int_equal(o.graph.atom[2].atom_class, 2);
  drop(&o);
  /* An old program's Latin-1 name. */
  assert_int_equal(read_text(".mol", "na\xEFve\n\n\n  1  0  0     0  0            999 V2000\n"
                                     ATOM("C  ", PLAIN) END, &o), MHO_OK);
  assert_string_equal(o.name, "na\xC3\xAFve");
  drop(&o);
}

static void a_bad_record_does_not_stop_the_rest(void **state)
{
  (void)state;
  static const char text[] = HEAD("  1  0") ATOM("C  ", PLAIN) END "> <data>\n1\n\n$$$$\n"
                             HEAD("  1  0") ATOM("R  ", PLAIN) END "$$$$\r\n"
                             HEAD("  1  0") ATOM("N  ", PLAIN) END "\n\n";
  mho_records *records;
  mho_record record;
  mho_graph graph;
  mho_error error;
  mho_graph_init(&graph);
  mho_error_init(&error);
  put_file(".sdf", text);
  assert_int_equal(mho_records_open(path, &records, &error), MHO_OK);
  assert_int_equal(mho_records_next(records, &graph, &record, NULL, &error), MHO_OK);
  assert_int_equal(record.number, 1);
  assert_int_equal(mho_records_next(records, &graph, &record, NULL, &error), MHO_ERR_UNPARAMETERISED);
  assert_int_equal(error.cause[0].line, 15);
  assert_int_equal(mho_records_next(records, &graph, &record, NULL, &error), MHO_OK);
  assert_int_equal(graph.atom[0].element, 7);
  assert_int_equal(record.number, 3);
  assert_int_equal(mho_records_next(records, &graph, &record, NULL, &error), MHO_OK);
  assert_int_equal(record.number, 0);
  mho_records_close(records);
  mho_graph_clear(&graph);
  remove(path);
}

/* A chain of 1200 carbons needs V3000. */
static void many_atoms(void **state)
{
  (void)state;
  enum { COUNT = 1200 };
  char *text = malloc(200 * COUNT), *at = text;
  outcome o;
  at += sprintf(at, "\n\n\n  0  0  0     0  0            999 V3000\nM  V30 BEGIN CTAB\n"
                    "M  V30 COUNTS %d %d 0 0 0\nM  V30 BEGIN ATOM\n", COUNT, COUNT - 1);
  for (int a = 1; a <= COUNT; a++) at += sprintf(at, "M  V30 %d C %d 0 0 0\n", a, a);
  at += sprintf(at, "M  V30 END ATOM\nM  V30 BEGIN BOND\n");
  for (int b = 1; b < COUNT; b++) at += sprintf(at, "M  V30 %d %d %d %d\n", b, 1 + b % 2, b, b + 1);
  sprintf(at, "M  V30 END BOND\nM  V30 END CTAB\nM  END\n");
  assert_int_equal(read_text(".mol", text, &o), MHO_OK);
  assert_string_equal(o.formula, "C1200H1202");
  drop(&o);
  free(text);
}

/* Bond lengths and twist of a made-up biphenyl skeleton in space. */
static void geometry_from_coordinates(void **state)
{
  (void)state;
  mho_graph *g;
  mho_structure s;
  mho_molecule m;
  mho_structure_options options;
  mho_structure_options_init(&options);
  options.contacts_optional = true;
  options.hopping = MHO_HOPPING_BOND_LENGTH;
  mho_structure_init(&s);
  mho_molecule_init(&m);
  assert_int_equal(mho_smiles_read("C=CC=C", NULL, &s.graph, NULL), MHO_OK);
  assert_int_equal(mho_molecule_from_graph(&s, &options, &m, NULL), MHO_ERR_REFERENCE);
  g = &s.graph;
  /* C1 and C4 turned by 30 degrees about C2-C3; C2-C3 1.47 A, the others 1.34. */
  const double turn = 30 * 0.017453292519943295;
  const double at[4][3] = {{-0.67, 1.34 * 0.8660254037844386, 0}, {0, 0, 0}, {1.47, 0, 0},
                           {2.14, 1.34 * 0.8660254037844386 * cos(turn), 1.34 * 0.8660254037844386 * sin(turn)}};
  g->position = malloc(sizeof at);
  memcpy(g->position, at, sizeof at);
  g->is_3d = true;
  assert_int_equal(mho_molecule_from_graph(&s, &options, &m, NULL), MHO_OK);
  assert_true(m.bond[1].rotatable);
  assert_near(m.bond[1].twist_deg, 30, 1e-9);
  assert_close(m.bond[0].strength, exp(-(1.34 - 1.397) / 0.2623), 1e-12);
  assert_close(m.bond[1].strength, exp(-(1.47 - 1.397) / 0.2623), 1e-12);
  mho_structure_clear(&s);
  mho_molecule_clear(&m);
}

/* A para-linked benzene: four ring radii of 0.14 nm and two bonds. */
static void lengths_of_flat_molecules(void **state)
{
  (void)state;
  static const struct {
    const char *smiles;
    double length_nm;
    unsigned warning;
  } table[] = {
      {"Nc1ccc(N)cc1", 0.56, 0},
      {"Nc1cccc(N)c1", 0.14 * 3.4641016151377544, 0}, /* 2 sqrt(3) */
      {"Nc1ccc(cc1)-c1ccc(N)cc1", 0.98, 0},
      {"Nc1ccc(cc1)C#Cc1ccc(N)cc1", 0.14 * 9, 0},
      {"Nc1ccc(cc1)C#Cc1ccc(cc1)C#Cc1ccc(cc1)C#Cc1ccc(cc1)C#Cc1ccc(cc1)C#Cc1ccc(N)cc1", 0.14 * 29,
       MHO_WARN_LONG},
  };
  for (size_t i = 0; i < sizeof table / sizeof *table; i++) {
    mho_molecule m;
    double length;
    mho_length_kind kind;
    mho_molecule_init(&m);
    assert_int_equal(mho_molecule_read_smiles(table[i].smiles, NULL, NULL, 0, &m, NULL), MHO_OK);
    assert_int_equal(mho_molecule_length(&m, &length, &kind), MHO_OK);
    assert_int_equal(kind, MHO_LENGTH_IDEALISED);
    assert_near(length, table[i].length_nm, 1e-9);
    assert_int_equal(m.warnings & MHO_WARN_LONG, table[i].warning);
    mho_molecule_clear(&m);
  }
}

static void salts_leave_their_counterions(void **state)
{
  (void)state;
  static const struct {
    const char *smiles;
    int sites;
    const char *note;
  } table[] = {
      {"[Na+].[S-]c1ccc([S-])cc1.[Na+]", 8, "that of S2; the parts of Na1, S"},
      {"CCO.Nc1ccc(N)cc1", 8, "that of N4; the parts of C1 are left out"},
      {"Nc1ccc(N)cc1.Nc1ccc(N)cc1", 8, "the first largest"},
      {"[CH2:1]=C.C=[CH2:2]", 4, NULL}, /* marked as two: both stay */
  };
  for (size_t i = 0; i < sizeof table / sizeof *table; i++) {
    mho_molecule m;
    mho_molecule_init(&m);
    assert_int_equal(mho_molecule_read_smiles(table[i].smiles, NULL, NULL, 0, &m, NULL), MHO_OK);
    assert_int_equal(m.site_count, table[i].sites);
    bool found = false;
    for (int k = 0; k < m.notes.count; k++)
      found |= strstr(m.notes.text[k], table[i].note ? table[i].note : "separate parts") != NULL;
    if (i) assert_int_equal(found, table[i].note != NULL);
    mho_molecule_clear(&m);
  }
}

int main(void)
{
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(good_records),
      cmocka_unit_test(bad_records_tell_the_place),
      cmocka_unit_test(aromatic_bonds_and_v3000),
      cmocka_unit_test(a_bad_record_does_not_stop_the_rest),
      cmocka_unit_test(many_atoms),
      cmocka_unit_test(geometry_from_coordinates),
      cmocka_unit_test(lengths_of_flat_molecules),
      cmocka_unit_test(salts_leave_their_counterions),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
