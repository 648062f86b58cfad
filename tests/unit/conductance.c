/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Thermal conductance against closed forms of one level, and the model's small
 * promises (angles, Fermi level, contacts).
 */
#include "check.h"

#include <mho/compare.h>
#include <mho/conductance.h>
#include <mho/constants.h>
#include <mho/settings.h>
#include <mho/warning.h>


static mho_plan *level_plan(double level, double left, double right)
{
  double vector[] = {1.0}, shift[] = {0.0};
  mho_lead a = {1, &left, shift, vector, NULL}, b = {1, &right, shift, vector, NULL};
  mho_junction junction;
  mho_plan *plan = NULL;
  assert_int_equal(mho_junction_from_hamiltonian(1, &level, 2, 0.0, &a, &b, &junction, NULL),
                   MHO_OK);
  assert_int_equal(mho_plan_create(&junction, &plan, NULL), MHO_OK);
  mho_junction_clear(&junction);
  return plan;
}

static mho_conductance conductance(double level, double left, double right, double kelvin)
{
  mho_plan *plan = level_plan(level, left, right);
  mho_conductance g;
  assert_int_equal(mho_conductance_compute(plan, 0.0, kelvin, NULL, &g, NULL), MHO_OK);
  mho_plan_free(plan);
  return g;
}

/* Values computed outside this project from the trigamma form of
 * integral of a Lorentzian with -df/dE. */
static void one_level_has_its_closed_form(void **state)
{
  (void)state;
  assert_close(conductance(-0.5, 0.02, 0.05, 300).conductance_g0, 0.0040915293, 2e-8);
  assert_close(conductance(-0.5, 0.02, 0.05, 0).conductance_g0, 0.0039804956, 2e-8);
  assert_close(conductance(0, 0.02, 0.05, 300).conductance_g0, 0.48151537, 2e-8);
  assert_close(conductance(0, 0.02, 0.05, 0).conductance_g0, 0.81632653, 2e-8);
  mho_conductance g = conductance(-0.5, 0.02, 0.05, 300);
  assert_close(g.conductance_s, g.conductance_g0 * 7.748091729863649e-5, 1e-14);
  assert_close(g.log10_g0, log10(g.conductance_g0), 1e-14);
}

/* A level far narrower than kT: G = (pi/2) Gamma (-df/dE) for equal contacts
 * of Gamma each, up to terms of order (Gamma/kT)^2. */
static void a_needle_of_a_resonance_is_not_missed(void **state)
{
  (void)state;
  double kt = MHO_BOLTZMANN_EV_PER_K * 300;
  for (int e = -9; e <= -5; e++)
    for (int k = 0; k < 4; k++) {
      double gamma = pow(10, e), level = -0.137 * k;
      double x = level / kt, f = exp(x) / pow(1 + exp(x), 2) / kt;
      double expected = M_PI * gamma * f;
      double background = gamma * gamma / (level * level + kt * kt);
      double tolerance = 1e-6 * expected + 20 * background;
      assert_near(conductance(level, gamma, gamma, 300).conductance_g0, expected, tolerance);
    }
}

static void temperature_vanishes_smoothly(void **state)
{
  (void)state;
  double cold = conductance(-0.5, 0.02, 0.05, 0).conductance_g0;
  /* Sommerfeld: G(T) - G(0) is (pi kT)^2/6 T''. */
  double kt = MHO_BOLTZMANN_EV_PER_K * 1.0, width = 0.07;
  double d = 0.25 + width * width / 4;
  double curvature = 0.001 * (8 * 0.25 / (d * d * d) - 2 / (d * d));
  double sommerfeld = cold + M_PI * M_PI * kt * kt / 6 * curvature;
  assert_close(conductance(-0.5, 0.02, 0.05, 1).conductance_g0, sommerfeld, 1e-12);
  assert_close(conductance(-0.5, 0.02, 0.05, 0.02).conductance_g0, cold, 1e-9);
}

static void the_window_spans_what_it_says(void **state)
{
  (void)state;
  /* T(E) of a level below the window falls monotonically over it, so the
   * quantiles are the values at its 5 % and 95 % points. */
  mho_plan *plan = level_plan(-2.0, 0.3, 0.3);
  mho_conductance_options options = {.window_ev = 0.4};
  mho_conductance g, at[2];
  assert_int_equal(mho_conductance_compute(plan, 0.0, 300, &options, &g, NULL), MHO_OK);
  for (int k = 0; k < 2; k++)
    assert_int_equal(
        mho_conductance_compute(plan, k ? -0.36 : 0.36, 300, &options, &at[k], NULL), MHO_OK);
  assert_near(g.window_low_log10_g0, at[0].log10_g0, 1e-9);
  assert_near(g.window_high_log10_g0, at[1].log10_g0, 1e-9);
  options.window_ev = 0;
  assert_int_equal(mho_conductance_compute(plan, 0.0, 300, &options, &g, NULL), MHO_OK);
  assert_near(g.window_low_log10_g0, g.log10_g0, 1e-12);
  options.window_ev = -1;
  assert_int_equal(mho_conductance_compute(plan, 0.0, 300, &options, &g, NULL), MHO_ERR_RANGE);
  mho_plan_free(plan);
}

static void warnings_name_poles(void **state)
{
  (void)state;
  assert_true(conductance(0.05, 0.02, 0.05, 300).warnings & MHO_WARN_NEAR_POLE);
  assert_false(conductance(0.5, 0.02, 0.05, 300).warnings & MHO_WARN_NEAR_POLE);
  for (int k = 0; k < MHO_WARNING_COUNT; k++) assert_non_null(mho_warning_word(k));
  assert_null(mho_warning_word(MHO_WARNING_COUNT));
}

static void the_cosine_is_exact_where_it_must_be(void **state)
{
  (void)state;
  assert_true(mho_cos_deg(90) == 0 && mho_cos_deg(-90) == 0 && mho_cos_deg(270) == 0);
  assert_true(mho_cos_deg(60) == 0.5 && mho_cos_deg(120) == -0.5 && mho_cos_deg(-300) == 0.5);
  assert_true(mho_cos_deg(0) == 1 && mho_cos_deg(180) == -1 && mho_cos_deg(360) == 1);
  for (double a = -360; a <= 360; a += 7.3)
    assert_near(mho_cos_deg(a), cos(a * M_PI / 180), 2e-15);
}

static void fermi_levels_are_read_as_people_write_them(void **state)
{
  (void)state;
  mho_fermi fermi;
  char text[64], reason[256];
  static const struct {
    const char *text;
    mho_fermi_kind kind;
    double offset;
    const char *written;
  } good[] = {{"0 eV", MHO_FERMI_ENERGY, 0, "0 eV"},
              {"-200 meV", MHO_FERMI_ENERGY, -0.2, "-0.2 eV"},
              {"midgap", MHO_FERMI_MIDGAP, 0, "midgap"},
              {"homo + 1.2 eV", MHO_FERMI_HOMO, 1.2, "homo + 1.2 eV"},
              {"homo+1.2eV", MHO_FERMI_HOMO, 1.2, "homo + 1.2 eV"},
              {"lumo \xE2\x88\x92 0.3 eV", MHO_FERMI_LUMO, -0.3, "lumo - 0.3 eV"},
              {"lumo", MHO_FERMI_LUMO, 0, "lumo"}};
  for (size_t i = 0; i < sizeof good / sizeof *good; i++) {
    assert_int_equal(mho_fermi_read(good[i].text, &fermi, reason, sizeof reason), MHO_OK);
    assert_int_equal(fermi.kind, good[i].kind);
    assert_near(fermi.offset_ev, good[i].offset, 1e-15);
    assert_string_equal(mho_fermi_write(&fermi, text, sizeof text), good[i].written);
  }
  static const char *const bad[] = {"", "0", "homo 1 eV", "homo + 1", "midgap + 1 eV", "200 eV"};
  for (size_t i = 0; i < sizeof bad / sizeof *bad; i++)
    assert_int_not_equal(mho_fermi_read(bad[i], &fermi, reason, sizeof reason), MHO_OK);
}

static mho_conductance value(double log10_g0)
{
  return (mho_conductance){.has_log = true, .log10_g0 = log10_g0};
}

static void ratios_are_taken_in_decades(void **state)
{
  (void)state;
  mho_conductance computed[] = {value(-2), value(-3), value(-4.5)};
  mho_measured_peak peak[] = {{0, 1e-2, true, 0.3, MHO_HISTOGRAM_LOG},
                              {1, 1e-3, true, 0.3, MHO_HISTOGRAM_LINEAR},
                              {2, 1e-4, false, 0, MHO_HISTOGRAM_LOG},
                              {2, 1e-5, false, 0, MHO_HISTOGRAM_LOG}};
  double error_decades[] = {0.4, 0.5, -1};
  mho_comparison c[3];
  mho_agreement a;
  assert_int_equal(mho_compare_ratios(computed, error_decades, 3, peak, 4, -1, c, &a, NULL), MHO_OK);
  assert_int_equal(a.reference, 0);
  /* Mode of a log-normal in G lies exp(-sigma^2) below its median; at 0.3
   * decades that is a factor of 0.62. */
  assert_close(pow(10, -3 - c[1].measured_log10_g0), exp(-pow(0.3 * log(10), 2)), 1e-12);
  assert_near(c[2].measured_log10_g0, -4.5, 1e-12); /* mean of two groups */
  assert_near(c[2].deviation_decades, 0, 1e-12);
  assert_close(c[1].ratio_computed, 0.1, 1e-12);
  assert_near(c[1].deviation_decades, -0.09 * log(10), 1e-12);
  assert_int_equal(a.compared, 2);
  assert_int_equal(a.pairs, 3);
  assert_int_equal(a.ordered, 3);
  assert_near(c[1].computed_low, -3.5, 1e-12);
  assert_near(c[1].computed_high, -2.5, 1e-12);
  assert_true(c[0].has_error && !c[2].has_error);
  assert_int_equal(mho_compare_ratios(computed, error_decades, 3, peak, 0, -1, c, &a, NULL), MHO_ERR_REFERENCE);
}

int main(void)
{
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(one_level_has_its_closed_form),
      cmocka_unit_test(a_needle_of_a_resonance_is_not_missed),
      cmocka_unit_test(temperature_vanishes_smoothly),
      cmocka_unit_test(the_window_spans_what_it_says),
      cmocka_unit_test(warnings_name_poles),
      cmocka_unit_test(the_cosine_is_exact_where_it_must_be),
      cmocka_unit_test(fermi_levels_are_read_as_people_write_them),
      cmocka_unit_test(ratios_are_taken_in_decades),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
