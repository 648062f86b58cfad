/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Derivatives of ln T against central differences in 160 digits
 * (tests/physics/derivatives.json, made by derivatives.py with mpmath).
 */
#include "junctions.h"

#include <mho/gradient.h>

static double worst;

/* |p (got - exact)| <= 1e-9 (1 + kappa). */
static void compare(const char *what, size_t index, double scale, double got, double exact,
                    double kappa)
{
  double difference = fabs(scale) * fabs(got - exact), allowed = 1e-9 * (1 + kappa);
  worst = fmax(worst, difference / allowed);
  if (!(difference <= allowed))
    fail_msg("%s %zu: %.17g, exact %.17g, kappa %g", what, index, got, exact, kappa);
}

static void compare_gradient(const json_t *entry, const raw *r, bool banded)
{
  mho_plan *plan = plan_of(r, false, banded);
  json_t *hopping = json_object_get(entry, "hopping"), *coupling = json_object_get(entry, "coupling");
  size_t pairs = json_array_size(hopping), n = (size_t)r->sites;
  int(*pair)[2] = malloc((pairs + 1) * sizeof *pair);
  for (size_t p = 0; p < pairs; p++)
    for (size_t k = 0; k < 2; k++)
      pair[p][k] = (int)json_integer_value(json_array_get(json_array_get(hopping, p), k));
  mho_gradient *g;
  assert_int_equal(mho_gradient_create(plan, (const int(*)[2])pair, pairs, &g, NULL), MHO_OK);
  double energy = json_number_value(json_object_get(entry, "E"));
  assert_int_equal(mho_gradient_evaluate(plan, energy, g, NULL), MHO_OK);
  assert_false(g->point.node);
  for (size_t i = 0; i < n; i++) /* a site at alpha moves on the scale of its bonds */
    compare("onsite", i, fmax(1, fabs(r->h[i * n + i])), g->onsite[i],
            json_number_value(json_array_get(json_object_get(entry, "onsite"), i)), g->kappa);
  for (size_t p = 0; p < pairs; p++) {
    double h = r->h[(size_t)pair[p][0] * n + (size_t)pair[p][1]];
    compare("hopping", p, h == 0 ? 1 : h, g->hopping[p],
            json_number_value(json_array_get(json_array_get(hopping, p), 2)), g->kappa);
  }
  for (int c = 0; c < g->left + g->right; c++)
    compare("coupling", (size_t)c, plan->coupling_ev[c], g->coupling[c],
            json_number_value(json_array_get(coupling, (size_t)c)), g->kappa);
  compare("energy", 0, energy, g->energy, json_number_value(json_object_get(entry, "energy")),
          g->kappa);
  mho_gradient_free(g);
  free(pair);
  mho_plan_free(plan);
}

static void derivatives_agree_with_differences(void **state)
{
  (void)state;
  json_t *junctions = load_json("junctions.json"), *root = load_json("derivatives.json");
  size_t index;
  json_t *entry;
  json_array_foreach(json_object_get(root, "points"), index, entry)
  {
    size_t which = (size_t)json_integer_value(json_object_get(entry, "junction"));
    raw r;
    raw_read(json_array_get(json_object_get(junctions, "junctions"), which), &r);
    compare_gradient(entry, &r, false);
    compare_gradient(entry, &r, true);
    raw_clear(&r);
  }
  print_message("%zu points, worst %.2g of what is allowed\n", index, worst);
  assert_true(index >= 80);
  json_decref(junctions);
  json_decref(root);
}

/* Benzene, contacts in meta position, at alpha: an exact node. */
static void a_node_has_no_gradient(void **state)
{
  (void)state;
  double h[36] = {0}, one = 0.5, zero = 0, left[6] = {1}, right[6] = {0, 0, 1};
  for (int i = 0; i < 6; i++) h[i * 6 + (i + 1) % 6] = h[(i + 1) % 6 * 6 + i] = -2.7;
  raw r = {6, h, {{1, &one, &zero, left, NULL}, {1, &one, &zero, right, NULL}}};
  mho_plan *plan = plan_of(&r, false, false);
  mho_gradient *g;
  assert_int_equal(mho_gradient_create(plan, NULL, 0, &g, NULL), MHO_OK);
  assert_int_equal(g->pairs, 6);
  assert_int_equal(mho_gradient_evaluate(plan, 0.0, g, NULL), MHO_OK);
  assert_true(g->point.node && g->energy == 0 && g->hopping[0] == 0);
  int bad[1][2] = {{2, 6}};
  mho_gradient *none;
  assert_int_equal(mho_gradient_create(plan, (const int(*)[2])bad, 1, &none, NULL), MHO_ERR_SIZE);
  mho_gradient_free(g);
  mho_plan_free(plan);
}

int main(void)
{
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(derivatives_agree_with_differences),
      cmocka_unit_test(a_node_has_no_gradient),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
