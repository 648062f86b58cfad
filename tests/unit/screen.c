/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Requirements and goals in words, ranking against closed forms and against
 * plain sampling, and the parts that make a candidate quick against the slow
 * ways that they replace.
 */
#include "check.h"

#include <mho/mho.h>

#include <stdlib.h>

#include "analysis/perturb.h"
#include "analysis/samples.h"
#include "base/random.h"
#include "solver/gradient_sum.h"
#include "solver/plan.h"
#include "solver/poles_secular.h"

/* --- words -------------------------------------------------------------------- */

static void requirements_are_read(void **state)
{
  (void)state;
  static const struct {
    const char *text, *again;
  } good[] = {{"gap > 2 eV", "gap > 2 eV"},
              {"gap>=2000meV", "gap >= 2 eV"},
              {"  length <3 nm ", "length < 3 nm"},
              {"nodes = 0", "nodes = 0"},
              {"rings <= 4", "rings <= 4"},
              {"warnings != near-node", "warnings != near-node"},
              {"warnings = none", "warnings = none"},
              {"left-linker = amine", "left-linker = amine"},
              {"conductance >= 1e-4 G0", "conductance >= 0.0001 G0"},
              {"error < 0.5 decades", "error < 0.5 decades"}};
  for (size_t i = 0; i < sizeof good / sizeof *good; i++) {
    mho_screen_requirement r, again;
    char reason[400], text[100];
    assert_int_equal(mho_screen_require_read(good[i].text, &r, reason, sizeof reason), MHO_OK);
    assert_string_equal(mho_screen_require_write(&r, text, sizeof text), good[i].again);
    assert_int_equal(mho_screen_require_read(text, &again, reason, sizeof reason), MHO_OK);
    assert_near(again.value, r.value, 1e-12);
  }
  static const struct {
    const char *text;
    mho_status status;
    const char *says;
  } bad[] = {{"gp > 2 eV", MHO_ERR_KEY, "did you mean 'gap'?"},
             {"gap > 2", MHO_ERR_UNIT, "eV or meV"},
             {"gap > 2 nm", MHO_ERR_UNIT, "energy is needed"},
             {"gap 2 eV", MHO_ERR_SYNTAX, "<, <=, =, !=, >= or >"},
             {"gap => 2 eV", MHO_ERR_SYNTAX, "<, <=, =, !=, >= or >"},
             {"gap > two eV", MHO_ERR_SYNTAX, "not a number"},
             {"rings <= 4.5", MHO_ERR_SYNTAX, "whole number"},
             {"rings <= 4 nm", MHO_ERR_SYNTAX, "behind the value"},
             {"warnings = near-nod", MHO_ERR_REFERENCE, "did you mean 'near-node'?"},
             {"warnings < near-node", MHO_ERR_SYNTAX, "= or !="},
             {"right-linker = amin", MHO_ERR_REFERENCE, "did you mean 'amine'?"},
             {"conductance > 0 G0", MHO_ERR_RANGE, "above 0 G0"},
             {"", MHO_ERR_KEY, "conductance"}};
  for (size_t i = 0; i < sizeof bad / sizeof *bad; i++) {
    mho_screen_requirement r;
    char reason[400];
    assert_int_equal(mho_screen_require_read(bad[i].text, &r, reason, sizeof reason), bad[i].status);
    if (!strstr(reason, bad[i].says)) fail_msg("%s: %s", bad[i].text, reason);
    assert_int_equal(mho_screen_require_read(bad[i].text, &r, NULL, 0), bad[i].status);
  }
}

static void goals_are_read(void **state)
{
  (void)state;
  mho_screen_goal goal;
  char text[100], reason[400];
  static const char *const good[] = {"maximise conductance", "minimise length", "match gap 2.5 eV",
                                     "match conductance 0.001 G0"};
  for (size_t i = 0; i < sizeof good / sizeof *good; i++) {
    assert_int_equal(mho_screen_goal_read(good[i], &goal, reason, sizeof reason), MHO_OK);
    assert_string_equal(mho_screen_goal_write(&goal, text, sizeof text), good[i]);
  }
  assert_int_equal(mho_screen_goal_read("maximize gap", &goal, reason, sizeof reason), MHO_ERR_SYNTAX);
  assert_non_null(strstr(reason, "did you mean 'maximise'?"));
  assert_int_equal(mho_screen_goal_read("minimise warnings", &goal, reason, sizeof reason), MHO_ERR_KEY);
  assert_int_equal(mho_screen_goal_read("match gap", &goal, reason, sizeof reason), MHO_ERR_SYNTAX);
  assert_int_equal(mho_screen_goal_read("minimise gap 2 eV", &goal, reason, sizeof reason),
                   MHO_ERR_SYNTAX);
}

static void what_does_not_exist_meets_nothing(void **state)
{
  (void)state;
  mho_screen_quantities q = {0};
  mho_screen_requirement more = {MHO_SCREEN_gap_ev, MHO_IS_MORE, 2}, less = more;
  less.comparison = MHO_IS_LESS;
  assert_false(mho_screen_meets(&q, &more) || mho_screen_meets(&q, &less));
  mho_screen_set_value(&q, MHO_SCREEN_gap_ev, 2.5);
  assert_true(mho_screen_meets(&q, &more) && !mho_screen_meets(&q, &less));
  mho_screen_requirement none = {MHO_SCREEN_warnings, MHO_IS_EQUAL, 0};
  mho_screen_requirement node = {MHO_SCREEN_warnings, MHO_IS_UNEQUAL, MHO_WARN_NEAR_NODE};
  mho_screen_set_value(&q, MHO_SCREEN_warnings, MHO_WARN_NEAR_NODE | MHO_WARN_LONG);
  assert_false(mho_screen_meets(&q, &none) || mho_screen_meets(&q, &node));
  mho_screen_set_value(&q, MHO_SCREEN_warnings, MHO_WARN_LONG);
  assert_true(mho_screen_meets(&q, &node));
}

/* --- ranking ------------------------------------------------------------------ */

static mho_screen_quantities candidate(double log10_g0, double error, double fermi_slope)
{
  mho_screen_quantities q = {0};
  mho_screen_set_value(&q, MHO_SCREEN_log10_g0, log10_g0);
  mho_screen_set_value(&q, MHO_SCREEN_error_decades, error);
  mho_screen_set_value(&q, MHO_SCREEN_linear_decades, error);
  q.shared[MHO_SHARED_FERMI] = (float)fermi_slope;
  return q;
}

static double normal_below(double x) { return 0.5 * erfc(-x / sqrt(2)); }

/* P(a above b) = Phi(difference / sigma of the difference); sigma of E_F is 0.2. */
static void two_candidates_have_their_closed_form(void **state)
{
  (void)state;
  static const double slope[][2] = {{0, 0}, {1, 1}, {1, -1}, {1.5, 1.5}, {1.9, 0.5}};
  mho_screen_rank_options options = mho_screen_rank_defaults();
  options.top = 1;
  options.samples = 100000;
  for (size_t k = 0; k < sizeof slope / sizeof *slope; k++) {
    mho_screen_quantities q[2] = {candidate(-3.2, 0.4, slope[k][0]),
                                  candidate(-3.0, 0.4, slope[k][1])};
    double shared[2] = {0.2 * slope[k][0], 0.2 * slope[k][1]};
    double variance = pow(shared[0] - shared[1], 2);
    for (int i = 0; i < 2; i++) variance += 0.16 - shared[i] * shared[i];
    mho_screen_place place[2];
    mho_screen_ranking ranking;
    assert_int_equal(mho_screen_rank(q, 2, &options, place, &ranking, NULL), MHO_OK);
    double want = normal_below(0.2 / sqrt(variance));
    assert_int_equal(place[0].rank, 2);
    assert_int_equal(place[1].rank, 1);
    assert_near(place[1].top_probability, want, 5 * sqrt(want * (1 - want) / 1e5));
    assert_near(place[0].top_probability + place[1].top_probability, 1, 1e-12);
  }
}

enum { MANY = 300, TOP = 10 };

static int descending(const void *a, const void *b)
{
  double x = *(const double *)a, y = *(const double *)b;
  return (x < y) - (x > y);
}

static void make_many(mho_screen_quantities *q, size_t n)
{
  mho_random random = mho_random_stream(7, 0);
  for (size_t i = 0; i < n; i++) {
    double value = -3 + 0.8 * mho_random_normal(&random);
    q[i] = candidate(value, 0.3 + 0.2 * (double)(i % 3), mho_random_normal(&random));
    q[i].shared[MHO_SHARED_COUPLING + i % 4] = 0.6f;
  }
}

/* Against sampling of everyone by the documented formula, with other numbers. */
static void many_candidates_agree_with_plain_sampling(void **state)
{
  (void)state;
  static mho_screen_quantities q[MANY];
  static mho_screen_place place[MANY];
  static double hits[MANY], value[MANY], sorted[MANY];
  enum { SAMPLES = 40000 };
  mho_screen_ranking ranking;
  mho_screen_rank_options options = mho_screen_rank_defaults();
  options.samples = SAMPLES;
  make_many(q, MANY);
  assert_int_equal(mho_screen_rank(q, MANY, &options, place, &ranking, NULL), MHO_OK);
  mho_random random = mho_random_stream(99, 3);
  for (int s = 0; s < SAMPLES; s++) {
    double z[5];
    for (int p = 0; p < 5; p++) z[p] = mho_random_normal(&random);
    for (int i = 0; i < MANY; i++) {
      double fermi = 0.2 * (double)q[i].shared[MHO_SHARED_FERMI], coupling = 0.4 * 0.6f;
      double e = q[i].error_decades, square = fermi * fermi + coupling * coupling;
      double scale = square > e * e ? e / sqrt(square) : 1;
      value[i] = q[i].log10_g0 + scale * (fermi * z[0] + coupling * z[1 + i % 4]);
      if (scale == 1) value[i] += sqrt(e * e - square) * mho_random_normal(&random);
    }
    memcpy(sorted, value, sizeof value);
    qsort(sorted, MANY, sizeof *sorted, descending);
    for (int i = 0; i < MANY; i++) hits[i] += value[i] >= sorted[TOP - 1];
  }
  double sum = 0;
  for (int i = 0; i < MANY; i++) {
    double p = hits[i] / SAMPLES, error = sqrt((p * (1 - p) + 1e-5) / SAMPLES);
    assert_near(place[i].top_probability, p, 7 * error + 1e-4);
    sum += place[i].top_probability;
  }
  assert_near(sum, TOP, 1e-9);
  assert_true(ranking.distinguishable >= 1 && ranking.distinguishable < TOP);
}

/* Places by value, the same at any length of the tail and any thread count. */
static void order_is_by_value_and_stable(void **state)
{
  (void)state;
  const mho_screen_quantities nothing = {.has = 0};
  mho_screen_quantities q[6] = {candidate(-4, 0.3, 0), candidate(-2, 0.3, 0), candidate(-2, 0.3, 0),
                                nothing,               candidate(-3, 0.3, 0), candidate(-1, 0.3, 0)};
  mho_screen_set_value(&q[5], MHO_SCREEN_gap_ev, 1);
  for (int i = 0; i < 5; i++) mho_screen_set_value(&q[i], MHO_SCREEN_gap_ev, 3);
  mho_screen_requirement gap = {MHO_SCREEN_gap_ev, MHO_IS_MORE, 2};
  mho_screen_rank_options options = mho_screen_rank_defaults();
  options.requirement = &gap;
  options.requirements = 1;
  mho_screen_place place[6];
  mho_screen_ranking ranking;
  static const size_t rank[6] = {4, 1, 2, 5, 3, 0};
  assert_int_equal(mho_screen_rank(q, 6, &options, place, &ranking, NULL), MHO_OK);
  for (int i = 0; i < 6; i++) assert_int_equal(place[i].rank, rank[i]);
  assert_int_equal(ranking.ranked, 5);
  assert_int_equal(ranking.refused, 1);
  assert_int_equal(ranking.undefined, 1);
  assert_near(place[3].top_probability, 1, 0); /* five for ten places */
  assert_near(place[5].top_probability, 0, 0);
  options.goal = (mho_screen_goal){MHO_AIM_MATCH, MHO_SCREEN_log10_g0, -3.1};
  static const size_t match[6] = {2, 3, 4, 5, 1, 0};
  assert_int_equal(mho_screen_rank(q, 6, &options, place, &ranking, NULL), MHO_OK);
  for (int i = 0; i < 6; i++) assert_int_equal(place[i].rank, match[i]);
  options.goal = (mho_screen_goal){MHO_AIM_MINIMISE, MHO_SCREEN_log10_g0, 0};
  assert_int_equal(mho_screen_rank(q, 6, &options, place, &ranking, NULL), MHO_OK);
  assert_int_equal(place[0].rank, 1);
  assert_int_equal(place[3].rank, 5); /* what is not known is last in every aim */
}

static void distinguishable_groups_follow_their_errors(void **state)
{
  (void)state;
  /* neighbours 0.5 apart; errors of 0.1 tell them apart, of 0.6 do not, and of
   * 0.6 that all share do again */
  static const struct {
    double error, slope;
    size_t groups;
  } cases[] = {{0.1, 0, 4}, {0.6, 0, 2}, {0.6, 3, 4}};
  for (size_t k = 0; k < sizeof cases / sizeof *cases; k++) {
    mho_screen_quantities q[4];
    for (int i = 0; i < 4; i++) q[i] = candidate(-2 - 0.5 * i, cases[k].error, cases[k].slope);
    mho_screen_place place[4];
    mho_screen_ranking ranking;
    assert_int_equal(mho_screen_rank(q, 4, NULL, place, &ranking, NULL), MHO_OK);
    assert_int_equal(ranking.distinguishable, cases[k].groups);
  }
}

static void bad_options_are_refused(void **state)
{
  (void)state;
  mho_screen_quantities q = {0};
  mho_screen_place place;
  mho_screen_ranking ranking;
  mho_screen_rank_options options = mho_screen_rank_defaults();
  options.top = 0;
  assert_int_equal(mho_screen_rank(&q, 1, &options, &place, &ranking, NULL), MHO_ERR_RANGE);
  options = mho_screen_rank_defaults();
  options.samples = 99;
  assert_int_equal(mho_screen_rank(&q, 1, &options, &place, &ranking, NULL), MHO_ERR_RANGE);
  options = mho_screen_rank_defaults();
  options.goal.quantity = MHO_SCREEN_warnings;
  assert_int_equal(mho_screen_rank(&q, 1, &options, &place, &ranking, NULL), MHO_ERR_RANGE);
  assert_int_equal(mho_screen_rank(NULL, 0, NULL, NULL, &ranking, NULL), MHO_OK);
  assert_int_equal(ranking.ranked, 0);
}

/* --- what makes it quick -------------------------------------------------------- */

/* Para, meta (a node at E_F), twisted, several channels, weak coupling. */
static const char *const smiles[] = {"Nc1ccc(N)cc1",
                                     "Nc1cccc(N)c1",
                                     "Sc1ccc(cc1)-c1ccc(cc1)-c1cccc(S)c1",
                                     "OC(=O)c1ccc(C(=O)O)cc1",
                                     "n1ccc(cc1)-c1ccc(s1)-c1ccncc1",
                                     "N#Cc1ccc2cc(C#N)ccc2c1"};
enum { SMILES = sizeof smiles / sizeof *smiles };

typedef struct {
  mho_molecule molecule;
  mho_junction junction;
  mho_plan *plan;
} subject;

static subject make(const char *text)
{
  subject s;
  mho_molecule_init(&s.molecule);
  assert_int_equal(mho_molecule_read_smiles(text, NULL, NULL, 0, &s.molecule, NULL), MHO_OK);
  assert_int_equal(mho_junction_build(&s.molecule, &s.junction, NULL), MHO_OK);
  assert_int_equal(mho_plan_create(&s.junction, &s.plan, NULL), MHO_OK);
  return s;
}

static void drop(subject *s)
{
  mho_plan_free(s->plan);
  mho_junction_clear(&s->junction);
  mho_molecule_clear(&s->molecule);
}

static void normals_are_those_of_their_streams(void **state)
{
  (void)state;
  uint64_t at[16];
  double normal[16];
  mho_random random[16];
  for (uint64_t l = 0; l < 16; l++) {
    random[l] = mho_random_stream(5, l);
    at[l] = random[l].state;
  }
  for (int k = 0; k < 500; k++) {
    mho_samples_normals(at, normal);
    for (int l = 0; l < 16; l++) assert_near(normal[l], mho_random_normal(&random[l]), 4e-15);
  }
}

/* Sample by sample against a junction built for each. */
static void samples_are_those_of_moved_molecules(void **state)
{
  (void)state;
  enum { SAMPLES = 100 };
  double value[SAMPLES], linear[SAMPLES], worst = 0;
  for (int m = 0; m < SMILES; m++) {
    subject s = make(smiles[m]);
    mho_uncertainties sigma = mho_sensitivity_defaults().sigma;
    mho_sensitivity_row *row;
    size_t count;
    assert_int_equal(mho_parameter_list(&s.molecule, &sigma, &row, &count, NULL), MHO_OK);
    assert_int_equal(mho_samples_draw(&s.molecule, s.plan, s.junction.fermi_ev, row, count, 3, 0,
                                      SAMPLES, value, linear, NULL),
                     MHO_OK);
    double *shift = malloc(count * sizeof *shift), want;
    for (size_t i = 0; i < SAMPLES; i++) {
      mho_random random = mho_random_stream(3, i);
      for (size_t p = 0; p < count; p++) shift[p] = row[p].sigma * mho_random_normal(&random);
      assert_int_equal(mho_perturbed_log10(&s.molecule, s.junction.fermi_ev, row, count, shift,
                                           &want, NULL),
                       MHO_OK);
      assert_near(value[i], want, 3e-4);
      worst = fmax(worst, fabs(value[i] - want));
    }
    free(shift);
    free(row);
    drop(&s);
  }
  print_message("samples: at most %.1e decades off\n", worst);
}

static void gradient_sums_are_those_of_single_energies(void **state)
{
  (void)state;
  enum { ENERGIES = 45 };
  double energy[ENERGIES], transmission[ENERGIES], weight[ENERGIES];
  mho_point point[ENERGIES];
  for (int m = 0; m < SMILES; m++) {
    subject s = make(smiles[m]);
    mho_gradient *sum, *one;
    assert_int_equal(mho_gradient_create(s.plan, NULL, 0, &sum, NULL), MHO_OK);
    assert_int_equal(mho_gradient_create(s.plan, NULL, 0, &one, NULL), MHO_OK);
    for (int i = 0; i < ENERGIES; i++) {
      energy[i] = -1.1 + 0.05 * i; /* one is E_F, to rounding */
      weight[i] = 1.0 / (1 + i);
    }
    assert_int_equal(mho_transmission_sweep(s.plan, ENERGIES, energy, point, NULL), MHO_OK);
    for (int i = 0; i < ENERGIES; i++) transmission[i] = point[i].transmission;
    assert_int_equal(mho_gradient_sum(s.plan, ENERGIES, energy, transmission, weight, sum, NULL),
                     MHO_OK);
    double *site = calloc((size_t)sum->sites, sizeof *site), level = 0, kappa = 0, coupling = 0;
    for (int i = 0; i < ENERGIES; i++) {
      assert_int_equal(mho_gradient_evaluate(s.plan, energy[i], one, NULL), MHO_OK);
      for (int k = 0; k < sum->sites; k++) site[k] += weight[i] * one->onsite[k];
      level += weight[i] * one->energy;
      coupling += weight[i] * one->coupling[0];
      kappa += weight[i] * one->kappa;
    }
    for (int k = 0; k < sum->sites; k++) assert_near(sum->onsite[k], site[k], 1e-9 * (1 + kappa));
    assert_near(sum->energy, level, 1e-9 * (1 + kappa));
    assert_near(sum->coupling[0], coupling, 1e-9 * (1 + kappa));
    free(site);
    mho_gradient_free(sum);
    mho_gradient_free(one);
    drop(&s);
  }
}

/* Against the general eigensolver, which a plan without level pairs takes. */
static void secular_poles_are_eigenvalues(void **state)
{
  (void)state;
  for (int m = 0; m < SMILES; m++) {
    subject s = make(smiles[m]);
    int n = s.molecule.site_count;
    mho_pole quick[64], slow[64];
    assert_true(n <= 64);
    assert_int_equal(mho_poles(s.plan, quick, NULL), MHO_OK);
    mho_pole_pair *pair = s.plan->pair;
    s.plan->pair = NULL;
    assert_int_equal(mho_poles(s.plan, slow, NULL), MHO_OK);
    s.plan->pair = pair;
    for (int k = 0; k < n; k++) {
      assert_near(quick[k].energy_ev, slow[k].energy_ev, 1e-12);
      assert_near(quick[k].left_width_ev, slow[k].left_width_ev, 1e-11);
      assert_near(quick[k].right_width_ev, slow[k].right_width_ev, 1e-11);
    }
    drop(&s);
  }
}

/* Shared derivatives against central differences of the conductance. */
static double conductance_with(mho_molecule *m)
{
  mho_screen_workspace *w = mho_screen_workspace_create();
  mho_screen_quantities q;
  assert_int_equal(mho_screen_measure(w, m, NULL, &q, NULL), MHO_OK);
  mho_screen_workspace_free(w);
  return q.log10_g0;
}

static void shared_derivatives_agree_with_differences(void **state)
{
  (void)state;
  const double step = 1e-4;
  subject s = make("Nc1ccc(cc1)-c1ccc(S)cc1");
  mho_molecule *m = &s.molecule;
  mho_screen_quantities q;
  mho_screen_workspace *w = mho_screen_workspace_create();
  assert_int_equal(mho_screen_measure(w, m, NULL, &q, NULL), MHO_OK);
  mho_screen_workspace_free(w);
  double *knob[3] = {&m->fermi.offset_ev, &m->beta_ev, &m->contact[MHO_LEFT].coupling_ev};
  int at[3] = {MHO_SHARED_FERMI, MHO_SHARED_BETA, MHO_SHARED_COUPLING + MHO_LINKER_AMINE};
  for (int k = 0; k < 3; k++) {
    double kept = *knob[k];
    *knob[k] = k == 2 ? kept * exp(step) : kept + step;
    double up = conductance_with(m);
    *knob[k] = k == 2 ? kept * exp(-step) : kept - step;
    double down = conductance_with(m);
    *knob[k] = kept;
    assert_near((double)q.shared[at[k]], (up - down) / (2 * step), 2e-6);
  }
  int row = mho_parameters_find(m->parameters, "S-thiophene");
  for (int b = 0; b < m->site_count; b++) {
    if (m->site[b].row != row) continue;
    double h = mho_parameters_h(m->parameters, row), value[2];
    m->site[b].explicit_onsite = true;
    for (int side = 0; side < 2; side++) {
      m->site[b].onsite_ev = (h + (side ? -step : step)) * m->beta_ev;
      value[side] = conductance_with(m);
    }
    assert_near((double)q.shared[MHO_SHARED_H + row], (value[0] - value[1]) / (2 * step), 2e-6);
  }
  assert_near((double)q.shared[MHO_SHARED_COUPLING + MHO_LINKER_PYRIDINE], 0, 0);
  drop(&s);
}

int main(void)
{
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(requirements_are_read),
      cmocka_unit_test(goals_are_read),
      cmocka_unit_test(what_does_not_exist_meets_nothing),
      cmocka_unit_test(two_candidates_have_their_closed_form),
      cmocka_unit_test(many_candidates_agree_with_plain_sampling),
      cmocka_unit_test(order_is_by_value_and_stable),
      cmocka_unit_test(distinguishable_groups_follow_their_errors),
      cmocka_unit_test(bad_options_are_refused),
      cmocka_unit_test(normals_are_those_of_their_streams),
      cmocka_unit_test(samples_are_those_of_moved_molecules),
      cmocka_unit_test(gradient_sums_are_those_of_single_energies),
      cmocka_unit_test(secular_poles_are_eigenvalues),
      cmocka_unit_test(shared_derivatives_agree_with_differences)};
  return cmocka_run_group_tests(tests, NULL, NULL);
}
