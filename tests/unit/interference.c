/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The map of all pairs: every pair against its own plan, magic integers and
 * nodes against published values, and what symmetry demands.
 */
#include "check.h"

#include <mho/conductance.h>
#include <mho/interference.h>
#include <mho/modify.h>
#include <mho/molecule_file.h>
#include <stdlib.h>

#include "analysis/pairs.h"
#include "analysis/site_change.h"
#include "analysis/thermal.h"

typedef struct {
  mho_molecule molecule;
  mho_junction junction;
  mho_interference map;
} subject;

static subject mapped(const char *smiles, double fermi_ev, const mho_interference_options *options)
{
  subject s = {0};
  mho_settings lenient = {.contacts_optional = true, .has_fermi = true,
                          .fermi = {.kind = MHO_FERMI_ENERGY, .offset_ev = fermi_ev}};
  mho_molecule_init(&s.molecule);
  assert_int_equal(mho_molecule_read_smiles(smiles, NULL, &lenient, 0, &s.molecule, NULL), MHO_OK);
  assert_int_equal(mho_junction_build(&s.molecule, &s.junction, NULL), MHO_OK);
  assert_int_equal(mho_interference_map(&s.molecule, &s.junction, options, &s.map, NULL), MHO_OK);
  return s;
}

static void clear(subject *s)
{
  mho_interference_clear(&s->map);
  mho_junction_clear(&s->junction);
  mho_molecule_clear(&s->molecule);
}

static const mho_pair *pair_of(const subject *s, const char *first, const char *second)
{
  int a = mho_molecule_find_site(&s->molecule, first);
  int b = mho_molecule_find_site(&s->molecule, second);
  for (size_t p = 0; p < s->map.count; p++) {
    const int *site = s->map.pair[p].site;
    if ((site[0] == a && site[1] == b) || (site[0] == b && site[1] == a)) return &s->map.pair[p];
  }
  fail_msg("no pair %s %s", first, second);
  return NULL;
}

static mho_point plan_value(const subject *s, const int *site, double coupling, double energy)
{
  size_t n = (size_t)s->junction.sites;
  double shift = 0, *vector = calloc(2 * n, sizeof *vector);
  mho_lead lead[2];
  mho_junction own;
  mho_plan *plan;
  mho_point point;
  for (size_t side = 0; side < 2; side++) {
    vector[side * n + (size_t)site[side]] = 1;
    lead[side] = (mho_lead){.channels = 1, .coupling_ev = &coupling, .shift_ev = &shift,
                            .vector = vector + side * n};
  }
  assert_int_equal(mho_junction_from_hamiltonian((int)n, s->junction.hamiltonian_ev, 0, 0, &lead[0],
                                                 &lead[1], &own, NULL), MHO_OK);
  assert_int_equal(mho_plan_create(&own, &plan, NULL), MHO_OK);
  assert_int_equal(mho_transmission_sweep(plan, 1, &energy, &point, NULL), MHO_OK);
  mho_plan_free(plan);
  mho_junction_clear(&own);
  free(vector);
  return point;
}

static void every_pair_is_its_plan(void **state)
{
  (void)state;
  static const char *const smiles[] = {"c1ccc2cccc2cc1", "c1ccc2cc3ccccc3cc2c1", "c1ccncc1",
                                       "C=CC=CC=C", "[CH2]C=C", "C=C1C=CC=C1"};
  static const double fermi[] = {0, -0.4, 1.1, 2.7};
  for (size_t m = 0; m < sizeof smiles / sizeof *smiles; m++)
    for (int e = 0; e < 4; e++) {
      mho_interference_options options = {.coupling_ev = 0.8, .every_site = true};
      subject s = mapped(smiles[m], fermi[e], &options);
      size_t n = (size_t)s.junction.sites;
      assert_int_equal(s.map.count, n * (n - 1) / 2);
      for (size_t p = 0; p < s.map.count; p++) {
        const mho_pair *pair = &s.map.pair[p];
        mho_point point = plan_value(&s, pair->site, 0.8, fermi[e]);
        bool node = pair->kind == MHO_PAIR_NODE_SYMMETRY || pair->kind == MHO_PAIR_NODE_CANCELLATION;
        if (point.node || node) assert_true(node && point.transmission < 1e-26);
        else assert_close(pair->transmission, point.transmission, 1e-9);
      }
      clear(&s);
    }
}

static int largest_magic(const subject *s)
{
  int largest = 0;
  for (size_t p = 0; p < s->map.count; p++) {
    assert_non_null(s->map.pair[p].magic);
    int magic = atoi(s->map.pair[p].magic);
    if (magic > largest) largest = magic;
  }
  return largest;
}

/* M = K |beta g|: Y. Geng et al., J. Am. Chem. Soc. 137, 4469 (2015); for
 * anthanthrene the largest conductance ratio of that series is 81 = 9^2. */
static void magic_numbers_are_the_published_ones(void **state)
{
  (void)state;
  static const struct {
    const char *smiles;
    int structures, largest;
  } known[] = {{"c1ccccc1", 2, 1}, {"c1ccc2ccccc2c1", 3, 2}, {"c1ccc2cc3ccccc3cc2c1", 4, 4},
               {"c1cc2ccc3cccc4ccc(c1)c2c34", 6, 0},
               {"c1cc2ccc3cc4cccc5ccc6cc(c1)c2c3c6c45", 10, 9}};
  for (size_t m = 0; m < sizeof known / sizeof *known; m++) {
    subject s = mapped(known[m].smiles, 0, NULL);
    int largest = largest_magic(&s);
    if (known[m].largest) assert_int_equal(largest, known[m].largest);
    for (size_t p = 0; p < s.map.count; p++)
      assert_near(atoi(s.map.pair[p].magic),
                  known[m].structures * fabs(2.7 * s.map.pair[p].green_per_ev), 1e-9);
    clear(&s);
  }
  /* Anthracene: (9,10) 4, (1,4) 3, (2,6) 1, (2,7) 0; C7 and C12 are 9 and 10. */
  subject s = mapped("c1ccc2cc3ccccc3cc2c1", 0, NULL);
  assert_string_equal(pair_of(&s, "C5", "C12")->magic, "4");
  clear(&s);
  s = mapped("c1ccncc1", 0, NULL); /* sites differ */
  assert_null(s.map.pair[0].magic);
  clear(&s);
  s = mapped("c1ccc2cccc2cc1", 0, NULL); /* an odd ring */
  assert_null(s.map.pair[0].magic);
  clear(&s);
}

/* 64 bits overflow for a ribbon of hexagons; M stays an integer. */
static void magic_numbers_may_be_long(void **state)
{
  (void)state;
  char smiles[2000] = "";
  for (int i = 0; i < 50; i++) strcat(smiles, "c1ccc(cc1)-");
  strcat(smiles, "c1ccccc1"); /* 2^51 structures times what separates the ends */
  mho_interference_options options = {.coupling_ev = 0.5, .magic = true};
  mho_settings flat = {.contacts_optional = true};
  subject s = {0};
  mho_molecule_init(&s.molecule);
  assert_int_equal(mho_molecule_read_smiles(smiles, NULL, &flat, 0, &s.molecule, NULL), MHO_OK);
  for (int b = 0; b < s.molecule.bond_count; b++) s.molecule.bond[b].twist_deg = 0;
  assert_int_equal(mho_junction_build(&s.molecule, &s.junction, NULL), MHO_OK);
  assert_int_equal(mho_interference_map(&s.molecule, &s.junction, &options, &s.map, NULL), MHO_OK);
  size_t digits = 0;
  for (size_t p = 0; p < s.map.count; p++)
    if (strlen(s.map.pair[p].magic) > digits) digits = strlen(s.map.pair[p].magic);
  assert_int_equal(digits, 16); /* ortho or para in one ring: K/2 = 2^50 */
  clear(&s);
}

/* Orbits of pairs by Burnside's lemma: the mean number of pairs that a symmetry
 * of the drawn molecule (planar point groups D6h, D2h, C2v, C2h, Cs) keeps. */
static void symmetry_unites_pairs(void **state)
{
  (void)state;
  static const struct {
    const char *smiles;
    size_t orbits;
  } known[] = {{"c1ccccc1", 3}, {"c1ccc2ccccc2c1", 15}, {"c1ccc2cc3ccccc3cc2c1", 28},
               {"c1ccc2cccc2cc1", 25}, {"c1ccncc1", 9}, {"C=CC=CC=C", 9}, {"C=CC=CC=N", 15}};
  for (size_t m = 0; m < sizeof known / sizeof *known; m++) {
    mho_interference_options options = {.coupling_ev = 0.5, .every_site = true, .nodes = true};
    subject s = mapped(known[m].smiles, 0.3, &options);
    mho_pair_graph graph;
    size_t *leader = malloc(s.map.count * sizeof *leader), orbits = 0;
    assert_int_equal(mho_pair_graph_build(&s.junction, &graph), MHO_OK);
    assert_int_equal(mho_pairs_orbits(&s.junction, &graph, &s.map, leader), MHO_OK);
    for (size_t p = 0; p < s.map.count; p++) {
      const mho_pair *pair = &s.map.pair[p], *first = &s.map.pair[leader[p]];
      orbits += leader[p] == p;
      assert_true(leader[p] <= p && leader[leader[p]] == leader[p]);
      assert_int_equal(pair->kind, first->kind);
      assert_near(pair->transmission, first->transmission, 0);
      assert_near(pair->node_ev, first->node_ev, 0);
      size_t n = (size_t)s.junction.sites; /* the same bonds apart, at least */
      assert_int_equal(graph.distance[(size_t)pair->site[0] * n + (size_t)pair->site[1]],
                       graph.distance[(size_t)first->site[0] * n + (size_t)first->site[1]]);
    }
    assert_int_equal(orbits, known[m].orbits);
    mho_pair_graph_clear(&graph);
    free(leader);
    clear(&s);
  }
}

static void meta_is_a_node_and_stays_one(void **state)
{
  (void)state;
  subject s = mapped("c1ccccc1", 0, NULL);
  for (size_t p = 0; p < s.map.count; p++) {
    const mho_pair *pair = &s.map.pair[p];
    int apart = pair->site[1] - pair->site[0];
    if (apart > 3) apart = 6 - apart;
    assert_int_equal(pair->kind, apart == 2 ? MHO_PAIR_NODE_SYMMETRY : MHO_PAIR_CONSTRUCTIVE);
    assert_int_equal(pair->starring, apart == 2 ? MHO_RULE_NODE : MHO_RULE_CONDUCTS);
    assert_int_equal(pair->cross_conjugation, pair->starring);
    /* Six turns and mirrors: one value for each distance. */
    for (size_t q = 0; q < p; q++) {
      const mho_pair *other = &s.map.pair[q];
      int far = other->site[1] - other->site[0];
      if ((far > 3 ? 6 - far : far) != apart) continue;
      assert_near(pair->transmission, other->transmission, 1e-15);
      assert_near(pair->green_per_ev, other->green_per_ev, 1e-15);
      assert_near(pair->overturning_shift_ev, other->overturning_shift_ev, 1e-8);
    }
  }
  clear(&s);
}

/* Nodes of azulene at x = 0 and -0.375 (5,7), none in the gap for 4,7; the
 * starring rule fails for 1,3 (J. Xia et al., Nano Lett. 14, 2941 (2014)). */
static void azulene_breaks_the_rules(void **state)
{
  (void)state;
  /* C1 C2 C3 are 5 6 7, C4 is 8, C5 8a, C6 C7 C8 1 2 3, C9 3a, C10 4. */
  subject s = mapped("c1ccc2cccc2cc1", 0, NULL);
  const mho_pair *across = pair_of(&s, "C5", "C7"); /* 1,3 of the small ring */
  assert_int_equal(across->kind, MHO_PAIR_CONSTRUCTIVE);
  assert_int_equal(across->starring, MHO_RULE_NODE);
  assert_true(mho_pair_disagrees(across, across->starring));
  assert_false(mho_pair_disagrees(across, across->orbital));
  const mho_pair *node = pair_of(&s, "C2", "C10"); /* 5,7: both beside C1, which is 6 */
  assert_int_equal(node->kind, MHO_PAIR_NODE_CANCELLATION);
  assert_true(node->has_node && node->node_order == 1);
  assert_near(node->node_ev, 0, 1e-9);
  clear(&s);
  s = mapped("c1ccc2cccc2cc1", 0.9, NULL); /* now -0.375 beta is nearer */
  assert_near(pair_of(&s, "C2", "C10")->node_ev, 0.375 * 2.7 - 0.9, 2e-3);
  clear(&s);
}

/* At the overturning shift |g| is at its threshold, or a node is there. */
static void the_verdict_turns_where_it_says(void **state)
{
  (void)state;
  mho_interference_options options = {.coupling_ev = 0.5, .nodes = true};
  subject s = mapped("c1ccc2cccc2cc1", 0.1, &options);
  int turned = 0;
  for (size_t p = 0; p < s.map.count; p++) {
    const mho_pair *pair = &s.map.pair[p];
    if (!pair->has_shift || pair->overturning_shift_ev == pair->node_ev) continue;
    double sides[2];
    for (int k = 0; k < 2; k++) {
      double g = 0, e = 0.1 + pair->overturning_shift_ev * (k ? 1 + 1e-5 : 1 - 1e-5);
      size_t n = (size_t)s.junction.sites;
      for (size_t i = 0; i < n; i++)
        g += s.junction.orbital[i * n + (size_t)pair->site[0]] *
             s.junction.orbital[i * n + (size_t)pair->site[1]] / (e - s.junction.level_ev[i]);
      sides[k] = fabs(g);
    }
    bool conducts = pair->kind == MHO_PAIR_CONSTRUCTIVE;
    assert_true(conducts ? sides[1] < sides[0] : sides[1] > sides[0]);
    turned++;
  }
  assert_true(turned > 20);
  clear(&s);
}

/* The nearest node of the sampled search is the exact one. */
static void sampled_nodes_are_the_exact_ones(void **state)
{
  (void)state;
  mho_interference_options options = {.coupling_ev = 0.5, .nodes = true};
  /* Forty-two sites: over the limit of the exact search. */
  subject s = mapped("c1ccc2cc3cc4cc5cc6cc7cc8cc9cc%10ccccc%10cc9cc8cc7cc6cc5cc4cc3cc2c1", 0.05,
                     &options);
  assert_int_equal(s.junction.sites, 42);
  int found = 0;
  for (size_t p = 0; p < s.map.count; p += 7) {
    const mho_pair *pair = &s.map.pair[p];
    if (!pair->has_node || fabs(pair->node_ev) < 1e-9) continue;
    mho_point point = plan_value(&s, pair->site, 0.5, 0.05 + pair->node_ev);
    assert_true(point.transmission < 1e-12);
    found++;
  }
  assert_true(found > 20);
  clear(&s);
}

static void what_cannot_be_mapped_is_refused(void **state)
{
  (void)state;
  subject s = mapped("c1ccccc1", 0, NULL);
  mho_interference map;
  mho_interference_options options = {.coupling_ev = 0};
  assert_int_equal(mho_interference_map(&s.molecule, &s.junction, &options, &map, NULL),
                   MHO_ERR_RANGE);
  mho_interference_clear(&map);
  clear(&s);
}

static double drawn_log10(const char *smiles, mho_alkyl alkyl)
{
  mho_settings settings = {.has_alkyl = true, .alkyl = alkyl};
  mho_molecule m;
  mho_junction junction;
  mho_plan *plan;
  mho_conductance g;
  mho_molecule_init(&m);
  assert_int_equal(mho_molecule_read_smiles(smiles, NULL, &settings, 0, &m, NULL), MHO_OK);
  assert_int_equal(mho_junction_build(&m, &junction, NULL), MHO_OK);
  assert_int_equal(mho_plan_create(&junction, &plan, NULL), MHO_OK);
  assert_int_equal(mho_conductance_compute(plan, junction.fermi_ev, m.temperature_k, NULL, &g, NULL),
                   MHO_OK);
  mho_plan_free(plan);
  mho_junction_clear(&junction);
  mho_molecule_clear(&m);
  return g.log10_g0;
}

/* The junction with H' written out, sites of the chain behind the others. */
static void changed_log10(const mho_junction *j, const mho_site_change *c, const double *fermi,
                          size_t levels, double *log10_g0)
{
  size_t n = (size_t)j->sites, all = n + (size_t)c->chain, at = (size_t)c->site;
  double *h = calloc(all * all, sizeof *h), *vector = calloc(2 * all, sizeof *vector);
  mho_lead lead[2] = {j->lead[0], j->lead[1]};
  mho_junction own;
  mho_plan *plan;
  for (size_t i = 0; i < n; i++)
    for (size_t k = 0; k < n; k++) h[i * all + k] = j->hamiltonian_ev[i * n + k];
  h[at * all + at] += c->onsite_ev;
  for (int b = 0; b < c->bonds; b++) {
    size_t other = (size_t)c->partner[b];
    h[at * all + other] = h[other * all + at] += c->hopping_ev[b];
  }
  for (size_t k = 0; k < (size_t)c->chain; k++) {
    size_t from = k ? n + k - 1 : at, to = n + k;
    h[to * all + to] = c->chain_onsite_ev[k];
    h[from * all + to] = h[to * all + from] = c->chain_hopping_ev[k];
  }
  for (size_t side = 0; side < 2; side++) {
    memcpy(vector + side * all, j->lead[side].vector, n * sizeof *vector);
    lead[side].vector = vector + side * all;
  }
  assert_int_equal(mho_junction_from_hamiltonian((int)all, h, 0, 0, &lead[0], &lead[1], &own, NULL), MHO_OK);
  assert_int_equal(mho_plan_create(&own, &plan, NULL), MHO_OK);
  assert_int_equal(mho_thermal_log10(plan, NULL, fermi, levels, 0.0259, log10_g0, NULL), MHO_OK);
  mho_plan_free(plan);
  mho_junction_clear(&own);
  free(h);
  free(vector);
}

static void changes_of_a_site_are_new_junctions(void **state)
{
  (void)state;
  static const char *const smiles[] = {"Nc1ccc(cc1)-c1ccc(N)cc1", "Nc1cccc(N)c1",
                                       "Sc1ccc2cc3cc(S)ccc3cc2c1", "Nc1ccc(C=Cc2ccc(N)cc2)cc1"};
  double fermi[3] = {-0.4, 0, 0.5}, fast[12], slow[3];
  int reached = 0, tried = 0;
  for (size_t m = 0; m < sizeof smiles / sizeof *smiles; m++) {
    subject s = mapped(smiles[m], 0, NULL);
    for (int site = 0; site < s.junction.sites; site++) {
      const double *row = s.junction.hamiltonian_ev + site * s.junction.sites;
      mho_site_change change[4] = {{.site = site, .onsite_ev = -1.377},
                                   {.site = site, .chain = 1, .chain_onsite_ev = {-4},
                                    .chain_hopping_ev = {-2.2}},
                                   {.site = site, .chain = 2, .chain_onsite_ev = {0.01, -1.4},
                                    .chain_hopping_ev = {-2.7, -3.1}},
                                   {.site = site, .onsite_ev = -1.377}};
      for (int k = 0; k < s.junction.sites && change[3].bonds < 2; k++)
        if (k != site && row[k] != 0) {
          change[3].partner[change[3].bonds] = k;
          change[3].hopping_ev[change[3].bonds++] = 0.1 * row[k];
        }
      bool good[4];
      assert_int_equal(mho_site_changes(&s.junction, change, 4, fermi, 3, 0.0259, fast, good, NULL), MHO_OK);
      for (int k = 0; k < 4; k++) {
        tried++;
        if (!good[k]) continue;
        changed_log10(&s.junction, &change[k], fermi, 3, slow);
        for (int l = 0; l < 3; l++) assert_near(fast[3 * k + l], slow[l], 1e-8);
        reached++;
      }
    }
    clear(&s);
  }
  print_message("%d of %d changes by the formula\n", reached, tried);
  assert_true(reached > tried / 2);
}

/* A modified molecule is the one that a chemist would draw. */
static void modifications_are_the_molecules_drawn(void **state)
{
  (void)state;
  static const struct {
    const char *change, *smiles;
    mho_alkyl alkyl;
  } drawn[] = {{"CH to N", "Nc1ccc(N)nc1", MHO_ALKYL_IGNORED},
               {"methyl", "Nc1ccc(N)c(C)c1", MHO_ALKYL_INDUCTIVE},
               {"fluoro", "Nc1ccc(N)c(F)c1", MHO_ALKYL_IGNORED}};
  subject s = mapped("Nc1ccc(N)cc1", 0, NULL);
  mho_modifications ranked;
  double before = drawn_log10("Nc1ccc(N)cc1", MHO_ALKYL_IGNORED);
  assert_int_equal(mho_modify_rank(&s.molecule, &s.junction, 0.5, &ranked, NULL), MHO_OK);
  size_t kinds;
  mho_substituents(&kinds);
  assert_int_equal(ranked.count, 4 * kinds);
  for (size_t k = 0; k < sizeof drawn / sizeof *drawn; k++) {
    int found = 0;
    double expected = drawn_log10(drawn[k].smiles, drawn[k].alkyl);
    for (size_t i = 0; i < ranked.count; i++) {
      if (strcmp(ranked.row[i].substituent->name, drawn[k].change)) continue;
      assert_near(ranked.row[i].log10_g0, expected, 1e-9);
      assert_near(ranked.row[i].change_decades, expected - before, 1e-9);
      assert_true(ranked.row[i].window_low_decades <= ranked.row[i].window_high_decades);
      found++;
    }
    assert_int_equal(found, 4);
  }
  for (size_t i = 1; i < ranked.count; i++)
    assert_true(fabs(ranked.row[i].change_decades) <=
                fabs(ranked.row[i - 1].change_decades) + 1e-8);
  mho_modifications_clear(&ranked);
  clear(&s);
}

int main(void)
{
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(every_pair_is_its_plan),
      cmocka_unit_test(magic_numbers_are_the_published_ones),
      cmocka_unit_test(magic_numbers_may_be_long),
      cmocka_unit_test(symmetry_unites_pairs),
      cmocka_unit_test(meta_is_a_node_and_stays_one),
      cmocka_unit_test(azulene_breaks_the_rules),
      cmocka_unit_test(the_verdict_turns_where_it_says),
      cmocka_unit_test(sampled_nodes_are_the_exact_ones),
      cmocka_unit_test(changes_of_a_site_are_new_junctions),
      cmocka_unit_test(modifications_are_the_molecules_drawn),
      cmocka_unit_test(what_cannot_be_mapped_is_refused),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
