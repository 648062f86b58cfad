/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Inside views by their conservation laws, on the junctions of junctions.json:
 * cuts, Kirchhoff's law, sums over orbitals and eigenchannels.
 */
#include "junctions.h"

#include <mho/inside.h>

typedef struct {
  int points, cuts, multi;
} tally;

static bool on_contact(const raw *r, int side, int site)
{
  for (int c = 0; c < r->lead[side].channels; c++)
    if (r->lead[side].vector[(size_t)c * (size_t)r->sites + (size_t)site] != 0) return true;
  return false;
}

/* Sites 0..count-1 in the order of distance from the left contact on one side:
 * any set that holds the left and not the right contact is a cut. */
static void check_cut(const raw *r, const mho_inside *view, unsigned set, double largest,
                      tally *count)
{
  for (int i = 0; i < r->sites; i++) {
    if (on_contact(r, 0, i) && on_contact(r, 1, i)) return;
    if (on_contact(r, 0, i)) set |= 1u << i;
    if (on_contact(r, 1, i)) set &= ~(1u << i);
  }
  double sum = 0;
  for (size_t k = 0; k < view->bonds; k++) {
    bool from = set >> view->bond[k].from & 1, to = set >> view->bond[k].to & 1;
    if (from != to) sum += from ? view->bond[k].flow : -view->bond[k].flow;
  }
  assert_near(sum, view->transmission, 1e-10 * fmax(largest, view->transmission));
  count->cuts++;
}

static void check_point(const raw *r, const mho_junction *junction, const mho_plan *plan,
                        double energy, tally *count)
{
  mho_inside view;
  assert_int_equal(mho_inside_compute(junction, plan, energy, &view, NULL), MHO_OK);
  double *balance = calloc((size_t)r->sites, sizeof(double)), largest = 0;
  for (size_t k = 0; k < view.bonds; k++) {
    balance[view.bond[k].from] -= view.bond[k].flow;
    balance[view.bond[k].to] += view.bond[k].flow;
    largest = fmax(largest, fabs(view.bond[k].flow));
  }
  for (int i = 0; i < r->sites; i++)
    if (!on_contact(r, 0, i) && !on_contact(r, 1, i))
      assert_near(balance[i], 0, 1e-10 * fmax(largest, view.transmission));
  for (unsigned set = 0; set < 5; set++) check_cut(r, &view, set * 2654435761u, largest, count);
  double orbitals = 0, channels = 0, size = 0;
  for (size_t k = 0; k < view.orbitals; k++) {
    assert_true(view.orbital[k].alone >= 0);
    orbitals += view.orbital[k].alone + view.orbital[k].interference;
    size += view.orbital[k].alone + fabs(view.orbital[k].interference);
  }
  for (size_t k = 0; k < view.eigenchannels; k++) channels += view.eigenchannel[k];
  assert_near(orbitals, view.transmission, 1e-10 * fmax(size, view.transmission));
  assert_near(channels, view.transmission, 1e-10 * view.transmission + 1e-300);
  count->multi += view.eigenchannels > 1;
  count->points++;
  free(balance);
  mho_inside_clear(&view);
}

static void currents_and_shares_add_up(void **state)
{
  (void)state;
  json_t *root = load_json("junctions.json"), *entry;
  size_t index;
  tally count = {0};
  json_array_foreach(json_object_get(root, "junctions"), index, entry)
  {
    raw r;
    raw_read(entry, &r);
    mho_junction junction;
    mho_plan *plan;
    assert_int_equal(mho_junction_from_hamiltonian(r.sites, r.h, 0, 0, &r.lead[0], &r.lead[1],
                                                   &junction, NULL), MHO_OK);
    assert_int_equal(mho_plan_create(&junction, &plan, NULL), MHO_OK);
    json_t *point;
    size_t k;
    json_array_foreach(json_object_get(entry, "points"), k, point)
    {
      double energy = json_number_value(json_object_get(point, "E"));
      json_t *kappa = json_object_get(point, "kappa");
      double t = strtod(json_string_value(json_object_get(point, "T")), NULL);
      /* the sums below are in double, and so must be able to tell T */
      if (t > 1e-20 && json_is_number(kappa) && json_number_value(kappa) < 1e4)
        check_point(&r, &junction, plan, energy, &count);
    }
    mho_plan_free(plan);
    mho_junction_clear(&junction);
    raw_clear(&r);
  }
  json_decref(root);
  print_message("%d points, %d cuts, %d with several channels\n", count.points, count.cuts,
                count.multi);
  assert_true(count.points > 500 && count.cuts > 1000 && count.multi > 50);
}

/* Meta-linked benzene a little off its node: the short way carries a current
 * that the long way brings back (a ring current larger than T). */
static void a_ring_current_flows_near_a_node(void **state)
{
  (void)state;
  double h[36] = {0}, gamma = 0.5, zero = 0, left[6] = {1}, right[6] = {0, 0, 1};
  for (int i = 0; i < 6; i++) h[i * 6 + (i + 1) % 6] = h[(i + 1) % 6 * 6 + i] = -2.7;
  mho_lead lead[2] = {{1, &gamma, &zero, left, NULL}, {1, &gamma, &zero, right, NULL}};
  mho_junction junction;
  mho_plan *plan;
  mho_inside view;
  assert_int_equal(mho_junction_from_hamiltonian(6, h, 6, 0, &lead[0], &lead[1], &junction, NULL),
                   MHO_OK);
  assert_int_equal(mho_plan_create(&junction, &plan, NULL), MHO_OK);
  assert_int_equal(mho_inside_compute(&junction, plan, 0.2, &view, NULL), MHO_OK);
  double largest = 0;
  for (size_t k = 0; k < view.bonds; k++) largest = fmax(largest, fabs(view.bond[k].flow));
  assert_true(largest > 2 * view.transmission);
  mho_inside_clear(&view);
  junction.sites = 5;
  assert_int_equal(mho_inside_compute(&junction, plan, 0.2, &view, NULL), MHO_ERR_SIZE);
  mho_plan_free(plan);
  mho_junction_clear(&junction);
}

int main(void)
{
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(currents_and_shares_add_up),
      cmocka_unit_test(a_ring_current_flows_near_a_node),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
