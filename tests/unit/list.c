/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "check.h"

#include <stdlib.h>
#include <unistd.h>

#include "molecule/list.h"

static char path[64];

/* A list with that content; the file is gone when the test ends. */
static mho_list *list_of(const char *extension, const char *content, size_t size,
                         mho_error *error)
{
  snprintf(path, sizeof path, "/tmp/mho-list-%ld.%s", (long)getpid(), extension);
  FILE *file = fopen(path, "wb");
  assert_non_null(file);
  assert_int_equal(fwrite(content, 1, size, file), size);
  fclose(file);
  mho_error_init(error);
  mho_list *list = NULL;
  mho_status status = mho_list_open(path, &list, error);
  unlink(path);
  assert_int_equal(status == MHO_OK, list != NULL);
  return list;
}

static void expect_row(mho_list *list, const char *smiles, const char *name, long line,
                       long column)
{
  mho_list_row row;
  assert_int_equal(mho_list_next(list, &row, NULL), MHO_OK);
  if (!smiles) {
    assert_null(row.smiles);
    return;
  }
  assert_string_equal(row.smiles, smiles);
  assert_string_equal(row.name, name);
  assert_int_equal(row.place.line, line);
  assert_int_equal(row.place.column, column);
}

static void expect_bad(mho_list *list, long line, long column, const char *part)
{
  mho_list_row row;
  mho_error error;
  mho_error_init(&error);
  assert_int_equal(mho_list_next(list, &row, &error), MHO_ERR_SYNTAX);
  assert_int_equal(error.cause[0].line, line);
  assert_int_equal(error.cause[0].column, column);
  assert_non_null(strstr(error.cause[0].message, part));
}

static void smi_keeps_names_and_drops_line_ends(void **state)
{
  (void)state;
  static const char text[] =
      "\xEF\xBB\xBFSMILES Name\r\n"
      "c1ccccc1 benzene\r\n"
      "\r\n"
      "# a comment\n"
      "  CC=O\tacetaldehyde, \xC3\xA9thanal \xE4\xB8\x80  \t\r\n"
      "C=C\n"
      "C#N hydrogen cyanide";
  mho_error error;
  mho_list *list = list_of("smi", text, sizeof text - 1, &error);
  expect_row(list, "c1ccccc1", "benzene", 2, 1);
  expect_row(list, "CC=O", "acetaldehyde, \xC3\xA9thanal \xE4\xB8\x80", 5, 3);
  expect_row(list, "C=C", "", 6, 1);
  expect_row(list, "C#N", "hydrogen cyanide", 7, 1);
  expect_row(list, NULL, NULL, 0, 0);
  expect_row(list, NULL, NULL, 0, 0);
  mho_list_close(list);
}

static void a_bad_row_does_not_stop_the_rest(void **state)
{
  (void)state;
  static const char text[] = "C=C one\nC=C \xC3\xA9\xE9 two\nC\0C three\nC#C four\n";
  mho_error error;
  mho_list *list = list_of("txt", text, sizeof text - 1, &error);
  expect_row(list, "C=C", "one", 1, 1);
  expect_bad(list, 2, 6, "UTF-8");
  expect_bad(list, 3, 1, "NUL");
  expect_row(list, "C#C", "four", 4, 1);
  expect_row(list, NULL, NULL, 0, 0);
  mho_list_close(list);
}

static void csv_finds_its_columns_by_the_header(void **state)
{
  (void)state;
  static const char text[] =
      "\xEF\xBB\xBFid;Formula;Smiles;name\r\n"
      "7;C2H4;C=C;ethene  \r\n"
      "8;\"C2H2;x\";\"C#C\";\"the \"\"yne\"\"\nin two lines\"\r\n"
      "9;C6H6;c1ccccc1\r\n"
      "\r\n"
      "\xC3\xA9;\"x\"y;C;z\n"
      "\xC3\xA9; CO ; C=O ;\xC3\xA9thanal\n"
      "10;;;none\n"
      "11;;C;last";
  mho_error error;
  mho_list *list = list_of("CSV", text, sizeof text - 1, &error);
  expect_row(list, "C=C", "ethene", 2, 8);
  expect_row(list, "C#C", "the \"yne\"\nin two lines", 3, 13);
  expect_bad(list, 5, 1, "3 fields, the header 4");
  expect_bad(list, 7, 3, "closed");
  expect_row(list, "C=O", "\xC3\xA9thanal", 8, 9);
  expect_bad(list, 9, 5, "no SMILES");
  expect_row(list, "C", "last", 10, 5);
  expect_row(list, NULL, NULL, 0, 0);
  mho_list_close(list);
}

static void a_bad_smiles_is_reported_where_it_stands(void **state)
{
  (void)state;
  static const char text[] = "name,smiles\n\xC3\xA9,c1ccc(\nx,C=C\n";
  mho_error error;
  mho_list *list = list_of("csv", text, sizeof text - 1, &error);
  mho_list_row row;
  mho_graph graph;
  mho_graph_init(&graph);
  assert_int_equal(mho_list_next(list, &row, NULL), MHO_OK);
  assert_int_equal(mho_smiles_read(row.smiles, &row.place, &graph, &error), MHO_ERR_SYNTAX);
  char line[200], expected[200];
  mho_cause_format(&error.cause[0], line, sizeof line);
  snprintf(expected, sizeof expected, "%s:2:8: column 6: '(' is never closed", path);
  assert_string_equal(line, expected);
  expect_row(list, "C=C", "x", 3, 3);
  mho_list_close(list);
}

static void what_is_no_list_is_refused(void **state)
{
  (void)state;
  static const struct {
    const char *extension, *text;
    mho_status status;
  } bad[] = {{"csv", "name,formula\nx,C\n", MHO_ERR_KEY},
             {"csv", "", MHO_ERR_KEY},
             {"smi", "\xFF\xFE" "C", MHO_ERR_SYNTAX},
             {"tsv", "\"smiles\tx\n", MHO_ERR_SYNTAX}};
  for (size_t i = 0; i < sizeof bad / sizeof *bad; i++) {
    mho_error error;
    assert_null(list_of(bad[i].extension, bad[i].text, strlen(bad[i].text), &error));
    assert_int_equal(error.cause[0].status, bad[i].status);
  }
  mho_error error;
  mho_list *list = list_of("smi", "", 0, &error);
  expect_row(list, NULL, NULL, 0, 0);
  mho_list_close(list);
  assert_int_equal(mho_list_open("/nonexistent.smi", &list, NULL), MHO_ERR_FILE);
  assert_null(list);
}

/* Lists are read a piece of 64 KiB at a time; rows lie across the borders. */
static void long_lists_and_rows(void **state)
{
  (void)state;
  enum { ROWS = 20000, LONG = 2 << 20 };
  char *text = malloc(ROWS * 64 + LONG + 100), *at = text, smiles[80], name[80];
  assert_non_null(text);
  at += sprintf(at, "name,smiles,note\n");
  for (int i = 0; i < ROWS; i++)
    at += sprintf(at, "\"n, %d\",%.*sC,\"two\nlines %d\"\n", i, i % 20, "CCCCCCCCCCCCCCCCCCCC", i);
  at += sprintf(at, "long,");
  memset(at, 'C', LONG);
  at += LONG;
  at += sprintf(at, ",\nlast,C,\n");
  mho_error error;
  mho_list *list = list_of("csv", text, (size_t)(at - text), &error);
  for (int i = 0; i < ROWS; i++) {
    snprintf(smiles, sizeof smiles, "%.*sC", i % 20, "CCCCCCCCCCCCCCCCCCCC");
    int length = snprintf(name, sizeof name, "n, %d", i);
    expect_row(list, smiles, name, 2 + 2 * i, length + 4); /* after quotes and comma */
  }
  expect_bad(list, 2 + 2 * ROWS, 1, "longer than");
  expect_row(list, "C", "last", 3 + 2 * ROWS, 6);
  expect_row(list, NULL, NULL, 0, 0);
  mho_list_close(list);
  free(text);
}

/* Whatever a quote that is left open swallows, the next line is a row. */
static void an_open_quote_ends_with_its_line(void **state)
{
  (void)state;
  static const char text[] = "smiles,name\nC,\"open\nCC,two\nCCC,\"three\"\nCCCC,\"x\nCCCCC,five\n";
  mho_error error;
  mho_list *list = list_of("csv", text, sizeof text - 1, &error);
  expect_bad(list, 2, 3, "closed");
  expect_row(list, "CC", "two", 3, 1);
  expect_row(list, "CCC", "three", 4, 1);
  expect_bad(list, 5, 6, "closed");
  expect_row(list, "CCCCC", "five", 6, 1);
  expect_row(list, NULL, NULL, 0, 0);
  mho_list_close(list);
}

int main(void)
{
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(smi_keeps_names_and_drops_line_ends),
      cmocka_unit_test(a_bad_row_does_not_stop_the_rest),
      cmocka_unit_test(csv_finds_its_columns_by_the_header),
      cmocka_unit_test(a_bad_smiles_is_reported_where_it_stands),
      cmocka_unit_test(what_is_no_list_is_refused),
      cmocka_unit_test(long_lists_and_rows),
      cmocka_unit_test(an_open_quote_ends_with_its_line),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
