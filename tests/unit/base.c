/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "check.h"

#include <mho/constants.h>
#include <mho/quantity.h>

#include "base/lapack.h"
#include "base/text.h"

#include <locale.h>

static void every_status_has_a_text(void **state)
{
  (void)state;
#define CHECK_TEXT(code, text, input)                                          \
  assert_string_equal(mho_status_text(code), text);                            \
  assert_int_equal(mho_status_is_input(code), input);
  MHO_STATUS_LIST(CHECK_TEXT)
#undef CHECK_TEXT
  assert_string_equal(mho_status_text((mho_status)9999), "an unknown status");
}

static void an_error_keeps_ten_causes_and_counts_the_rest(void **state)
{
  (void)state;
  mho_error error;
  mho_error_init(&error);
  for (int i = 0; i < 13; i++)
    assert_int_equal(mho_fail_at(&error, MHO_ERR_RANGE, "input", "m.yaml", i + 1, 2,
                                 "angle", "cause %d", i),
                     MHO_ERR_RANGE);
  assert_int_equal(error.count, MHO_ERROR_CAPACITY);
  assert_int_equal(error.suppressed, 3);
  char line[200];
  mho_cause_format(&error.cause[0], line, sizeof line);
  assert_string_equal(line, "m.yaml:1:2: cause 0");
  assert_int_equal(mho_fail(NULL, MHO_ERR_SIZE, "base", NULL, "dropped"), MHO_ERR_SIZE);
}

static void quantities_come_out_in_base_units(void **state)
{
  (void)state;
  static const struct {
    const char *text;
    mho_dimension dimension;
    double value;
  } good[] = {
      {"0.3 eV", MHO_ENERGY, 0.3},        {"300meV", MHO_ENERGY, 0.3},
      {"-2.7 eV ", MHO_ENERGY, -2.7},     {"38 deg", MHO_ANGLE, 38},
      {"0.66 rad", MHO_ANGLE, 37.81521447863433}, {"300 K", MHO_TEMPERATURE, 300},
      {"0.2 V", MHO_VOLTAGE, 0.2},        {"1.2e-3 G0", MHO_CONDUCTANCE, 1.2e-3},
      {"0.9 nm", MHO_LENGTH, 0.9},        {"6 kJ/mol", MHO_MOLAR_ENERGY, 6},
      {"1 kcal/mol", MHO_MOLAR_ENERGY, 4.184}, {"0.3 decades", MHO_DECADES, 0.3},
      {"12.9 uV/K", MHO_SEEBECK, 12.9},   {"+.5 eV", MHO_ENERGY, 0.5},
      {"5. eV", MHO_ENERGY, 5},
      /* 1/(2e^2/h): 77.48091729863649 uS is one quantum (SI of 2019). */
      {"77.48091729863649 uS", MHO_CONDUCTANCE, 1.0},
      {"77480.91729863649nS", MHO_CONDUCTANCE, 1.0},
  };
  for (size_t i = 0; i < sizeof good / sizeof *good; i++) {
    double value;
    assert_int_equal(mho_quantity_read(good[i].text, good[i].dimension, &value, NULL, 0), MHO_OK);
    assert_close(value, good[i].value, 1e-14);
  }
}

static void a_wrong_quantity_says_what_is_allowed(void **state)
{
  (void)state;
  static const struct {
    const char *text;
    mho_status status;
    const char *part;
  } bad[] = {
      {"0.3", MHO_ERR_UNIT, "write '0.3 eV'"},
      {"0.3 nm", MHO_ERR_UNIT, "is a length, but an energy is needed"},
      {"0.3 ev", MHO_ERR_UNIT, "did you mean 'eV'"},
      {"0.3 parsec", MHO_ERR_UNIT, "eV or meV"},
      {"eV", MHO_ERR_SYNTAX, "is not a number with a unit"},
      {"", MHO_ERR_SYNTAX, "is not a number"},
      {"nan eV", MHO_ERR_SYNTAX, "is not a number"},
      {"inf eV", MHO_ERR_SYNTAX, "is not a number"},
      {"1e999 eV", MHO_ERR_SYNTAX, "is not a number"},
      {"0x10 eV", MHO_ERR_UNIT, "is not known"},
      {"1,5 eV", MHO_ERR_UNIT, "is not known"},
  };
  for (size_t i = 0; i < sizeof bad / sizeof *bad; i++) {
    double value = 42;
    char reason[256];
    assert_int_equal(mho_quantity_read(bad[i].text, MHO_ENERGY, &value, reason, sizeof reason),
                     bad[i].status);
    assert_true(value == 42);
    if (!strstr(reason, bad[i].part)) fail_msg("'%s' gave: %s", bad[i].text, reason);
  }
}

/* The test makes a locale with a decimal comma where the machine can. */
static void numbers_do_not_follow_the_locale(void **state)
{
  (void)state;
  if (!setlocale(LC_ALL, "de_DE.UTF-8")) skip();
  char text[64];
  snprintf(text, sizeof text, "%.1f", 0.5);
  assert_string_equal(text, "0,5"); /* the locale is really in force */
  double value;
  const char *end;
  bool read = mho_number_read("2.5e1x", &end, &value);
  mho_number_write(text, sizeof text, 6, 0.125);
  setlocale(LC_ALL, "C");
  assert_true(read);
  assert_string_equal(end, "x");
  assert_true(value == 25.0);
  assert_string_equal(text, "0.125");
}

static void numbers_survive_a_round_trip(void **state)
{
  (void)state;
  const double values[] = {0.1, 1.0 / 3, -6.02214076e23, 5e-324, 1.7976931348623157e308, 0};
  for (size_t i = 0; i < sizeof values / sizeof *values; i++) {
    char text[64];
    const char *end;
    double value;
    mho_number_write(text, sizeof text, 17, values[i]);
    assert_true(mho_number_read(text, &end, &value));
    assert_true(value == values[i] && *end == '\0');
  }
  char text[64];
  mho_number_write(text, sizeof text, 6, -0.0);
  assert_string_equal(text, "0");
}

static void constants_are_those_of_the_si(void **state)
{
  (void)state;
  /* CODATA 2018: G0 = 7.748 091 729... e-5 S, k = 8.617 333 262... e-5 eV/K. */
  assert_close(MHO_CONDUCTANCE_QUANTUM_S, 7.748091729863649e-5, 1e-15);
  assert_close(MHO_BOLTZMANN_EV_PER_K, 8.617333262145178e-5, 1e-15);
}

static void a_misspelt_word_finds_its_neighbour(void **state)
{
  (void)state;
  static const char *const keys[] = {"sites", "bonds", "electrons", "electrodes"};
  assert_string_equal(mho_nearest_word("site", keys, 4), "sites");
  assert_string_equal(mho_nearest_word("electrode", keys, 4), "electrodes");
  assert_null(mho_nearest_word("wavelength", keys, 4));
  char text[64];
  assert_string_equal(mho_join_words(keys, 3, text, sizeof text), "sites, bonds or electrons");
}

static void utf8_is_checked(void **state)
{
  (void)state;
  assert_int_equal(mho_utf8_prefix("a\xC3\xA4z", 4), 4);
  assert_int_equal(mho_utf8_prefix("ab\xFFz", 4), 2);
  assert_int_equal(mho_utf8_prefix("\xC0\xAF", 2), 0);     /* overlong */
  assert_int_equal(mho_utf8_prefix("\xED\xA0\x80", 3), 0); /* surrogate */
  assert_int_equal(mho_utf8_prefix("a\xE2\x82", 3), 1);    /* cut short */
}

static void levels_of_a_small_matrix(void **state)
{
  (void)state;
  /* Ethene in units of beta: eigenvalues -1 and 1. */
  double matrix[4] = {0, 1, 1, 0}, levels[2];
  mho_error error;
  mho_error_init(&error);
  assert_int_equal(mho_eigen_symmetric(2, matrix, levels, &error), MHO_OK);
  assert_near(levels[0], -1, 1e-15);
  assert_near(levels[1], 1, 1e-15);
}

int main(void)
{
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(every_status_has_a_text),
      cmocka_unit_test(an_error_keeps_ten_causes_and_counts_the_rest),
      cmocka_unit_test(quantities_come_out_in_base_units),
      cmocka_unit_test(a_wrong_quantity_says_what_is_allowed),
      cmocka_unit_test(numbers_do_not_follow_the_locale),
      cmocka_unit_test(numbers_survive_a_round_trip),
      cmocka_unit_test(constants_are_those_of_the_si),
      cmocka_unit_test(a_misspelt_word_finds_its_neighbour),
      cmocka_unit_test(utf8_is_checked),
      cmocka_unit_test(levels_of_a_small_matrix),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
