/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Twists and pairs for levers.py: times as JSON on stdout, values as doubles in
 * a file.  Usage: bench_levers twist|map|pairs MOLECULE.yaml VALUES
 */
#include <mho/mho.h>

#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

enum { ANGLES = 1000000, SIDE = 1000, PASSES = 5 };

static double now(void)
{
  struct timespec t;
  clock_gettime(CLOCK_MONOTONIC, &t);
  return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

static void need(mho_status status)
{
  if (status == MHO_OK) return;
  fprintf(stderr, "%s\n", mho_status_text(status));
  exit(1);
}

static double run_twist(const mho_rotor *rotor, double fermi, double *cosine, double *value)
{
  double start = now();
  mho_twist_form form;
  bool good;
  need(mho_twist_form_find(rotor, fermi, &form, &good, NULL));
  for (int i = 0; i < ANGLES; i++) cosine[i] = 90.0 * i / (ANGLES - 1);
  mho_cos_deg_many(ANGLES, cosine, cosine);
  mho_twist_form_evaluate(&form, ANGLES, cosine, value);
  return good ? now() - start : -1;
}

static double run_map(const mho_rotor *rotor, double fermi, double *cosine, double *value)
{
  double start = now();
  for (int i = 0; i < SIDE; i++) cosine[i] = 90.0 * i / (SIDE - 1);
  mho_cos_deg_many(SIDE, cosine, cosine);
  for (int e = 0; e < SIDE; e++) {
    mho_twist_form form;
    bool good;
    need(mho_twist_form_find(rotor, fermi - 1.0 + 2.0 * e / (SIDE - 1), &form, &good, NULL));
    if (!good) return -1;
    mho_twist_form_evaluate(&form, SIDE, cosine, value + (size_t)e * SIDE);
  }
  return now() - start;
}

static double run_pairs(const mho_molecule *m, const mho_junction *junction, bool whole,
                        double *value, size_t *count)
{
  mho_interference map;
  mho_interference_options options = {.coupling_ev = 0.5, .every_site = true,
                                      .nodes = whole, .rules = whole, .magic = whole};
  double start = now();
  need(mho_interference_map(m, junction, &options, &map, NULL));
  double spent = now() - start;
  *count = map.count < ANGLES ? map.count : ANGLES;
  for (size_t p = 0; p < *count; p++) value[p] = map.pair[p].transmission;
  mho_interference_clear(&map);
  return spent;
}

/* All nodes between the molecule's own contacts, or those between its frontier levels. */
static double run_nodes(const mho_junction *junction, bool gap, double *value, size_t *count)
{
  mho_plan *plan;
  mho_nodes nodes;
  need(mho_plan_create(junction, &plan, NULL));
  double start = now();
  if (gap) need(mho_nodes_between(plan, junction->homo_ev, junction->lumo_ev, &nodes, NULL));
  else need(mho_nodes_find(plan, &nodes, NULL));
  double spent = now() - start;
  *count = 0;
  for (size_t k = 0; k < nodes.count; k++)
    if (nodes.node[k].kind == MHO_NODE_EXACT) value[(*count)++] = nodes.node[k].energy_ev;
  mho_nodes_clear(&nodes);
  mho_plan_free(plan);
  return spent;
}

int main(int argc, char **argv)
{
  if (argc != 4) return 2;
  mho_molecule m;
  mho_junction junction;
  mho_rotor *rotor = NULL;
  mho_settings settings = {.contacts_optional = true};
  need(mho_molecule_read(argv[2], NULL, &settings, &m, NULL));
  double start = now(), best = 1e9;
  need(mho_junction_build(&m, &junction, NULL));
  double levels = now() - start;
  int bond = -1;
  for (int b = 0; b < m.bond_count; b++)
    if (m.bond[b].rotatable) bond = b;
  if (bond >= 0) need(mho_rotor_create(&m, &junction, &bond, 1, &rotor, NULL));
  double *cosine = malloc(ANGLES * sizeof *cosine), *value = malloc(ANGLES * sizeof *value);
  if (!cosine || !value) return 1;
  size_t count = ANGLES;
  for (int pass = 0; pass < PASSES; pass++) {
    double spent = argv[1][0] == 't'   ? run_twist(rotor, junction.fermi_ev, cosine, value)
                   : argv[1][0] == 'm' ? run_map(rotor, junction.fermi_ev, cosine, value)
                        : argv[1][0] == 'n' ? run_nodes(&junction, false, value, &count)
                        : argv[1][0] == 'g' ? run_nodes(&junction, true, value, &count)
                                            : run_pairs(&m, &junction, argv[1][0] == 'a', value, &count);
    if (spent < 0) return 1;
    if (spent < best) best = spent;
  }
  if (argv[1][0] == 'p' || argv[1][0] == 'a') best += levels; /* the one factorisation */
  FILE *file = fopen(argv[3], "wb");
  if (!file || fwrite(value, sizeof *value, count, file) != count || fclose(file) != 0) return 1;
  printf("{\"seconds\": %.9g, \"count\": %zu}\n", best, count);
  free(cosine);
  free(value);
  mho_rotor_free(rotor);
  mho_junction_clear(&junction);
  mho_molecule_clear(&m);
  return 0;
}
